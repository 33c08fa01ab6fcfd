"""The demo: an invented region, before and after a service change."""
