"""Case files, rule forms, costs, exports and the command line. Nothing heavy is imported here."""
