"""Soils: gradation, plasticity, specimens, and the classification systems built on them."""
