"""Geostatistics on arrays: covariance models, kriging weights, simulated fields. It knows no soil."""
