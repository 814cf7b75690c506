"""The part that runs inside LibreOffice, under the package name sheetfuncs_bridge: uno and standard library only.

LibreOffice brings its own Python, which may be as old as 3.8 and has no numpy. Everything that is more than moving
cells happens in the worker process.
"""
