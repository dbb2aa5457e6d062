"""The commands: each is parsing, one public call, one renderer."""
