"""Published check values as CSV, and the one routine that compares our functions with them."""
