"""What to do about it: recipe, hand doses, stock tanks, acid, renewal, weighable amounts."""
