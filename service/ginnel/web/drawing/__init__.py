"""Charts, as documents that the chart library's script draws in the browser.

In comes an answer (see `answers/`) and a colour scheme, out go documents in JSON, made on the server: so they
are typed, and tests read them back without a browser. Nothing tells by colour alone: directions
differ in place or in pattern too, and each chart has its table on the page.
"""
