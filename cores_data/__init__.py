"""The open table of ring cores and core materials, CC0 1.0; see README.md beside this file."""
