"""How time and memory are measured, and how results are written down."""

import json
import os
import platform
import resource
import statistics
import subprocess
import sys
import time
from importlib import metadata
from pathlib import Path

HERE = Path(__file__).parent
PACKAGES = ("panelkit", "numpy", "numba", "scikit-learn", "celer", "skglm")


def seconds(task):
    """Return how long a task takes, and what it returns."""
    start = time.perf_counter()
    result = task()
    return time.perf_counter() - start, result


def alternate(tasks, repeats):
    """Return times and processor times of tasks, run in turn to meet the same load.

    tasks: name to callable of the round's number; some run in the first rounds only
    (`rounds`). The processor time counts all threads and no waiting for a busy machine.
    """
    times = {name: [] for name in tasks}
    processor = {name: [] for name in tasks}
    for turn in range(repeats):
        for name, task in tasks.items():
            if turn < getattr(task, "rounds", repeats):
                before = time.process_time()
                taken, _ = seconds(lambda task=task, turn=turn: task(turn))
                times[name].append(taken)
                processor[name].append(time.process_time() - before)
    return times, processor


def rounds(count):
    """Mark a task that is run in the first rounds only."""

    def mark(task):
        task.rounds = count
        return task

    return mark


def medians(times):
    return {name: statistics.median(found) for name, found in times.items() if found}


def paired_ratio(above, below):
    """Return the median of the ratios of two tasks' times, round by round."""
    return statistics.median(a / b for a, b in zip(above, below, strict=False))


def _proc_status(key):
    for line in Path("/proc/self/status").read_text().splitlines():
        if line.startswith(key):
            return int(line.split()[1]) * 1024
    raise LookupError(key)


def peak_bytes():
    """Return the largest resident size of this process since `forget_peak`."""
    if Path("/proc/self/status").exists():
        return _proc_status("VmHWM:")  # ru_maxrss would count the parent's before exec
    unit = 1 if sys.platform == "darwin" else 1024
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * unit


def forget_peak():
    """Let the peak begin at the present size, where the system can."""
    clear = Path("/proc/self/clear_refs")
    if clear.exists():
        clear.write_text("5")


def free_bytes():
    """Return the memory that is free for use, None where it is not known."""
    meminfo = Path("/proc/meminfo")
    if not meminfo.exists():
        return None
    for line in meminfo.read_text().splitlines():
        if line.startswith("MemAvailable:"):
            return int(line.split()[1]) * 1024
    return None


def _processor():
    cpuinfo = Path("/proc/cpuinfo")
    if cpuinfo.exists():
        for line in cpuinfo.read_text().splitlines():
            if line.startswith("model name"):
                return line.split(":", 1)[1].strip()
    return platform.processor()


def _git(*words):
    asked = subprocess.run(
        ["git", *words], cwd=HERE, capture_output=True, text=True, check=False
    )
    return asked.stdout.strip() if asked.returncode == 0 else ""


def circumstances():
    """Return machine, commit and versions: what a figure means nothing without."""
    versions = {}
    for name in PACKAGES:
        try:
            versions[name] = metadata.version(name)
        except metadata.PackageNotFoundError:
            versions[name] = None
    return {
        "machine": {
            "processor": _processor(),
            "cores": os.cpu_count(),
            "system": platform.platform(),
            "load": list(os.getloadavg()),
        },
        "commit": _git("rev-parse", "HEAD"),
        "changed": bool(_git("status", "--porcelain", "--", "../../panelkit")),
        "python": platform.python_version(),
        "versions": versions,
    }


def write_json(path, job, results):
    """Write one job's results with the circumstances, whole or not at all."""
    text = json.dumps({"job": job, **circumstances(), **results}, indent=1)
    part = path.with_suffix(".part")
    part.write_text(text + "\n")
    part.replace(path)


def run_job(job, folder):
    """Run one job in a process of its own and return what it wrote."""
    path = folder / f"{job}.json"
    subprocess.run(
        [sys.executable, str(HERE / "jobs.py"), job, str(path)],
        check=True,
        cwd=folder,
    )
    return json.loads(path.read_text())
