"""What people see: answers in words and plots, all from the results file alone."""
