"""The opinions: each takes a frame to an Answer or to Silent by a method of its own.

No opinion imports another, and none imports mechanics (stiffness, fixed-end action, load integration) from elsewhere in
the package: a formula that two of them need stands twice, on purpose.
"""
