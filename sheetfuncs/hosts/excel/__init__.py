"""Excel, through the open part of xlwings: functions in cells, macros behind the ribbon, and the add-in itself."""
