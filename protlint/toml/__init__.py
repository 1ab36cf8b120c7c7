"""The TOML files a user writes: read with the place of every key, taken key by key, and written."""
