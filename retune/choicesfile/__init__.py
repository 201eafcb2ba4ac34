"""The choices file: reading it, finding each decision's place in the score as it stands now,
proposing decisions, and bringing a file up to date.
"""
