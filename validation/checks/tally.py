"""Counting checks."""

import time
import traceback


class Tally:
    """Runs checks, prints one line each, counts."""

    def __init__(self):
        self.passed, self.failed = 0, 0

    def run(self, name, check, *arguments):
        start = time.perf_counter()
        try:
            check(*arguments)
        except Exception as error:  # a check may fail in any way; the next one still runs
            self.failed += 1
            print(f"FAILED  {name}: {error}", flush=True)
            if not isinstance(error, AssertionError):
                traceback.print_exc()
            return
        self.passed += 1
        print(f"ok      {name} ({time.perf_counter() - start:.1f} s)", flush=True)

    def close(self):
        """Print the closing line; the exit code."""
        print(f"{self.passed} passed, {self.failed} failed")
        return 0 if self.failed == 0 and self.passed > 0 else 1
