#!/usr/bin/env python3
"""usage: measure.py COMMAND...

Runs a command and prints its wall-clock seconds, peak memory in bytes and exit code as JSON. A program
of its own, and a small one: the peak memory of a child counts from the size of the process that
started it.
"""

import json
import os
import subprocess
import sys
import time

start = time.perf_counter()
child = subprocess.Popen(sys.argv[1:], stdin=subprocess.DEVNULL, stdout=subprocess.DEVNULL)
_, status, usage = os.wait4(child.pid, 0)
seconds = time.perf_counter() - start
child.returncode = os.waitstatus_to_exitcode(status)
measured = {"seconds": seconds, "memory": usage.ru_maxrss * 1024, "code": child.returncode}
print(json.dumps(measured))
