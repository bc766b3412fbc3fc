"""Fans that can be bought: catalogues, duty points, choice, and what becomes of them in service.

`read_catalogue` gives fans, `curves` their curves, `choose_variable` and `choose_fixed` the fan of
each design. Money is in `problems.costs`; nothing here knows of plates or heat.
"""
