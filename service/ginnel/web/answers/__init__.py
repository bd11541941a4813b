"""What each page shows, as one frozen value: asked of `reports`, made ready for template and charts.

No SQL, no Flask, and no statistics: those are `store`'s, `pages`' and `reports`'.
"""
