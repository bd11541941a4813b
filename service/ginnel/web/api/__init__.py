"""The same tables as JSON, under ``/api/v1``, with an OpenAPI document that is made from the code.

Everything is SI, times carry the site's offset, null is what is not known or was not listened to.
"""
