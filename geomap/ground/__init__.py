"""The soil that could lie in each cell between borings: records, their weights, and joint draws."""
