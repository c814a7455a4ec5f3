"""From files to the market panel: reading, matching, checks, on-sale inference."""
