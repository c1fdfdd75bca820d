"""Print how well the computed constants meet the published ones: `python -m shiftpred.electronics.check`."""

from __future__ import annotations

from shiftpred.electronics.fitting import LeftOut, fit_inductive, fit_resonance

__all__ = ["render_check"]


def render_check(n_worst: int = 8) -> str:
    """Return the leave-one-out correlations with their worst groups.

    Parameters
    ----------
    n_worst : int, default 8
        Groups to list for each constant.

    Returns
    -------
    str
        One block for each of sigma_I, sigma* and R.
    """
    _, inductive = fit_inductive()
    _, resonance = fit_resonance()
    return "\n".join(_render(left_out, n_worst) for left_out in (*inductive, resonance))


def _render(left_out: LeftOut, n_worst: int) -> str:
    lines = [
        f"{left_out.quantity}: r = {left_out.correlation:.3f} over {len(left_out.groups)} groups, each left out in turn; "
        f"mean difference {left_out.mean_error:.3f}",
        "  worst groups           published  computed",
    ]
    lines += [f"  {group:<22} {p:>9.2f} {c:>9.2f}" for group, p, c in left_out.worst(n_worst)]
    return "\n".join(lines) + "\n"


if __name__ == "__main__":
    print(render_check(), end="")
