"""The step size on a tape: its limit, its error, and what follows from that for the next step.

All lanes are judged at once; the loop looks only at lanes that call for attention.
"""

from __future__ import annotations

from meanfree.kernel.slots import Layout
from meanfree.kernel.tape import Op, Tape

SAFETY, SHRINK, GROW = 0.95, 0.05, 8.0
"""A new step is the best guess times SAFETY, within these factors; by fewest steps on ROBER and
random networks."""


def step_size(layout: Layout, t: Tape, gamma: float, out: dict[int, int]) -> int:
    """End the step at the stop where it would come close to it; 1/(h gamma)."""
    now, wish, stop = (t.input(layout.scalar(name)) for name in ("t", "h", "stop"))
    left = t.sub(stop, now)
    over = t.sub(t.mul(wish, t.const(1 + 1e-9)), left)
    limited = t.select(over, t.const(1.0), t.const(-1.0))
    h = t.select(over, left, wish)
    inverse_h = t.div(t.const(1.0), h)
    shift = t.mul(inverse_h, t.const(1.0 / gamma))
    for name, value in (
        ("h", h), ("limited", limited), ("inverse_h", inverse_h), ("inverse_h_gamma", shift),
    ):  # fmt: skip
        out[layout.scalar(name)] = value
    return shift


def judge(
    layout: Layout,
    t: Tape,
    error_order: int,
    argument: list[int],
    last: list[int],
    out: dict[int, int],
) -> None:
    """The new state, whether it is accepted, the next step, and whether the loop must look.

    The error is the root mean square of the last stage over the tolerances; with derivatives, the
    largest of those of the states and of each direction. May be repeated: nothing that is read
    here is written.
    """

    def scalar(name: str) -> int:
        return t.input(layout.scalar(name))

    lowest, sizes, states = t.const(0.0), list[int](), layout.states
    for i, (w, u) in enumerate(zip(argument, last, strict=True)):
        new = out[layout.new + i] = t.add(w, u)
        size = t.max(t.unary(Op.ABS, t.input(layout.state + i)), t.unary(Op.ABS, new))
        # A derivative counts as no smaller than what it is a derivative of.
        sizes.append(size if i < states else t.max(size, sizes[i % states]))
        if i < layout.system.n_gases:
            lowest = t.min(new, lowest)
    one, never = t.const(1.0), t.const(-1.0)
    error = _mean_square(layout, t, last, sizes, 0)
    for k in range(len(layout.directions) if layout.controlled else 0):
        further = _mean_square(layout, t, last, sizes, states * (1 + k))
        # What is no number must not be passed over for what is one.
        error = t.add(t.max(further, error), t.sub(further, further))
    power = t.mul(t.const(-0.5 / (error_order + 1)), t.unary(Op.ROUGH_LOG2, error))
    factor = t.mul(t.const(SAFETY), t.unary(Op.ROUGH_EXP2, power))
    factor = t.min(t.max(factor, t.const(SHRINK)), t.const(GROW))
    yes = t.sub(one, error)
    h, now = scalar("h"), scalar("t")
    reached = t.select(scalar("limited"), scalar("stop"), t.add(now, h))
    # After a refusal a step does not grow at once; what is no number is tried much smaller.
    growing = t.select(scalar("refused"), t.min(factor, one), factor)
    finite = t.sub(one, t.unary(Op.ABS, t.sub(error, error)))
    shrinking = t.select(finite, t.min(factor, t.const(0.5)), t.const(0.1))
    next_h = t.mul(h, t.select(yes, growing, shrinking))
    large_enough = t.min(t.nmadd(t.const(1e-15), now, next_h), t.sub(next_h, t.const(1e-280)))
    after_yes = t.max(scalar("limited"), scalar("automatic"))
    met_due = t.select(t.sub(scalar("due"), reached), after_yes, one)
    attention = t.select(yes, met_due, t.select(large_enough, never, one))
    attention = t.max(t.sub(scalar("bad"), scalar("worst")), attention)
    attention = t.max(t.sub(t.add(scalar("tried"), t.const(1.5)), scalar("most_steps")), attention)
    for name, value in (
        ("error", error), ("accepted", t.select(yes, one, t.const(0.0))),
        ("reached", reached), ("next_h", next_h), ("attention", attention),
        ("negative", t.neg(lowest)),
    ):  # fmt: skip
        out[layout.scalar(name)] = value


def _mean_square(layout: Layout, t: Tape, last: list[int], sizes: list[int], first: int) -> int:
    """Mean square of the errors of the states, or of their derivatives in one direction."""
    part, rtol = slice(first, first + layout.states), t.input(layout.scalar("rtol"))
    scales = [
        t.madd(rtol, size, absolute_tolerance(layout, t, i)) for i, size in enumerate(sizes[part])
    ]
    return t.mul(_sum_of_squares(t, last[part], scales), t.const(1.0 / layout.states))


def _sum_of_squares(t: Tape, values: list[int], scales: list[int]) -> int:
    """Sum of (value/scale)^2 with one division for four: divisions cost as much as ten products."""
    total, one = t.const(0.0), t.const(1.0)
    for start in range(0, len(values), 4):
        group = scales[start : start + 4]
        before, after = [one], [one]
        for scale in group[:-1]:
            before.append(t.mul(before[-1], scale))
        for scale in reversed(group[1:]):
            after.append(t.mul(after[-1], scale))
        product = t.mul(before[-1], group[-1])
        inverse = t.div(one, product)
        # 0 for a number; what overflows must not pass for an error of nothing.
        total = t.add(total, t.sub(product, product))
        for value, first, rest in zip(values[start:], before, reversed(after), strict=False):
            ratio = t.mul(t.mul(value, inverse), t.mul(first, rest))
            total = t.madd(ratio, ratio, total)
    return total


def absolute_tolerance(layout: Layout, t: Tape, i: int) -> int:
    """Absolute tolerance of a state, as for a single run."""
    system = layout.system
    if i < system.n_gases:
        return t.input(layout.atol + i)
    if layout.has_T and i == layout.T_index:
        return t.const(1e-11)
    if system.volume_varies and i == system.volume_index:
        return t.const(1e-14)
    if system.exchanges_heat and i == system.volume_index - 1:
        return t.input(layout.scalar("atol_heat"))
    return t.input(layout.scalar("atol_ledger"))


def accept(layout: Layout, t: Tape, out: dict[int, int]) -> None:
    """Where the step was accepted, its end becomes the present; steps are counted."""

    def scalar(name: str) -> int:
        return t.input(layout.scalar(name))

    accepted, one = scalar("accepted"), t.const(1.0)
    for i in range(layout.size):
        place = layout.state + i
        out[place] = t.select(accepted, t.input(layout.new + i), t.input(place))
    changes = {
        "t": t.select(accepted, scalar("reached"), scalar("t")),
        "h": scalar("next_h"),
        "refused": t.sub(one, accepted),
        "tried": t.add(scalar("tried"), one),
        "refusals": t.add(scalar("refusals"), t.sub(one, accepted)),
        "steps": t.add(scalar("steps"), accepted),
        "deepest": t.select(
            accepted, t.max(scalar("negative"), scalar("deepest")), scalar("deepest")
        ),
    }
    for name, value in changes.items():
        out[layout.scalar(name)] = value
