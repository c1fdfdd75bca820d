"""Many samples: read, queue, resume, engines, the page and the table."""

from shiftpred.triage.running import run_triage

__all__ = ["run_triage"]
