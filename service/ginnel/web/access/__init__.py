"""Who may see the dashboard, and what a browser may do with it.

A store without users shows its pages to whoever sits at this machine, and to nobody else. With the
first user everybody needs a name and a password, or a token; a stranger learns nothing at all.
"""
