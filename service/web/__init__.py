"""Plumbing that every route shares: unit of work, access, problem details, limits, paging."""
