"""What runs inside the office: standard library only, for every Python from 3.8 that an office brings.

The files of this folder are copied into the extension as they are. ``wire`` is also
the worker's, so that both ends of the pipe speak the same language.
"""
