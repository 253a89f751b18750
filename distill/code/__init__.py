"""What the exports to programming languages share: arguments, conditions, head comment, checks."""
