"""The law of growth over many periods, from the law of one."""
