"""Recordings of every format behind one door: `read` gives a `Record`; `write_comtrade` writes one."""

from twlocate.records.comtrade.writing import write_comtrade
from twlocate.records.reading import read
from twlocate.records.record import Channel, Clock, Record, Repair, StatusChannel, Stretch

__all__ = ["Channel", "Clock", "Record", "Repair", "StatusChannel", "Stretch", "read", "write_comtrade"]
