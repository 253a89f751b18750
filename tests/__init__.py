"""Tests of thumbwright, and slow independent versions of what it computes."""
