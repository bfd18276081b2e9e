"""Return models of a portfolio: the law of one period's return, one file each, and the law of the horizon."""
