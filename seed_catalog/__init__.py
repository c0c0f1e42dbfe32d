"""The demo: an invented distributor with invented makers, models, sites, stock and bundles."""
