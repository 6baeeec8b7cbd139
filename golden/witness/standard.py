"""Lets a family of kernels be called like a module of Python's standard library. Imported before anything else.

This folder comes first on the path, so `golden/witness/string` would hide the standard library's `string` from every
library that needs it. The standard one is loaded first, and then told to look for its submodules in the family's folder.
"""

import sys

HERE = __file__.rsplit("/", 1)[0]
sys.path[:] = [path for path in sys.path if path not in ("", HERE)]

import string  # noqa: E402

string.__path__ = [HERE + "/string"]
sys.path.insert(0, HERE)
