"""How it is searched, judged and shown. Knows nothing of heat, only `Problem`."""
