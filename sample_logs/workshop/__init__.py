"""The invented Tarnbeck Bench Works: its products' physics, its bench, and how its loggers write.

products      what a unit truly does: loss, droop, input dependence, heat; closed forms
instruments   what a meter makes of it: gain error, offset, noise, step
sequence      a test sequence run through both: samples, and the truth of each dwell
overload      what outputs do above their rated current
soak          a unit that warms up in a room that drifts, and its winding before and after
dialects      a table of samples -> the bytes of a log, as loggers of several kinds write it
workbook      the same for a workbook
units         the products and the benches' instruments
logfile       what a log is made of
*_logs        which unit of a product, with which fault, was logged how
*_stages      the same for stages beside the steady one, each in a file of its own
runs          the list of them all: the files of the folder above
"""
