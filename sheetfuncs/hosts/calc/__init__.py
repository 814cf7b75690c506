"""LibreOffice Calc: an extension with a thin bridge, and the worker process that does the work for it."""
