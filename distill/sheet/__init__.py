"""The policy sheet: from findings to plain strings, numbers and boxes; no layout and no files."""
