"""The audit: judges one set of results by the laws of statics and of compatibility, whatever any opinion says.

Nothing here imports an opinion; fixed-end actions and flexibilities are derived once more, on purpose.
"""
