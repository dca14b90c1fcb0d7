"""Every fault that the firmware must stand, brought about on the simulated board and measured.

python -m tests.system.fault_table          measures, and writes the table into host/docs/faults.md
"""
