"""Rule forms: one file per form, each behind the same small interface."""
