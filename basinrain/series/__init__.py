"""Basin-mean series of a whole record, and what is read off them: totals, storms, greatest depths."""
