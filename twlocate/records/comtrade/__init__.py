"""COMTRADE, the common format for transient data exchange: IEEE Std C37.111-1991, -1999 and -2013 (IEC 60255-24).

`configuration` reads the CFG text, `data` the samples, `timeline` turns stamps and rates into stretches,
`clock` says how far the absolute time may be trusted, `container` finds the parts, `reading` joins them.
"""
