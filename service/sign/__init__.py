"""What a sign says, from the answer of an evaluation: words, figures, tables. Knows the contract alone."""
