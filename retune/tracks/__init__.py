"""What a singer practises from."""
