"""The built-in choir voice and what else sounds in a learning track."""
