"""The plan file: save, load, recover, in-use lock."""
