"""Random changes of a certificate: of its structure and of its numbers."""

import copy
import re
from fractions import Fraction

LABELS = ("format", "title", "name", "unit", "ref")


def mutant(value, rng):
    """A changed copy of a JSON value, and what was changed."""
    words = []
    changed = copy.deepcopy(value)
    while changed == value or (len(words) < 2 and rng.random() < 0.2):
        words.append(change(*chosen(changed, rng), rng))
    return changed, "; ".join(words)


def chosen(value, rng):
    """A container and a key, mostly those of a text other than a label."""
    found = places(value, rng)
    texts = [(place, key) for place, key in found if isinstance(place[key], str) and key not in LABELS]
    return rng.choice(texts if texts and rng.random() < 0.7 else found)


def places(value, rng):
    """Containers and keys; one section is chosen first, so that long lists do not crowd out the rest."""
    section = rng.choice(sorted(value))
    while rng.random() < 0.6 and isinstance(value[section], dict) and value[section]:
        value = value[section]
        section = rng.choice(sorted(value))
    found = [(value, section)]
    open_values = [value[section]]
    while open_values:
        here = open_values.pop()
        keys = here.keys() if isinstance(here, dict) else range(len(here)) if isinstance(here, list) else ()
        for key in keys:
            found.append((here, key))
            open_values.append(here[key])
    return found


def change(place, key, rng):
    old = place[key]
    if isinstance(old, str) and rng.random() < 0.9:
        place[key] = changed_text(old, rng)
    elif isinstance(old, bool):
        place[key] = not old
    elif isinstance(old, list) and rng.random() < 0.8:
        place[key] = changed_list(old, rng)
    elif isinstance(old, dict) and old and rng.random() < 0.5:
        gone = rng.choice(sorted(old))
        place[key] = {k: v for k, v in old.items() if k != gone}
    elif isinstance(place, list):
        place.insert(key, old)
    else:
        del place[key]
    new = place[key] if isinstance(place, list) or key in place else "(nothing)"
    return f"{key}: {str(old)[:70]} -> {str(new)[:70]}"


def changed_list(old, rng):
    new = list(old)
    kind = rng.randrange(4)
    if not new or kind == 0:
        return new + new[:1]
    if kind == 1:
        del new[rng.randrange(len(new))]
    elif kind == 2:
        i = rng.randrange(len(new))
        new.insert(i, new[i])
    else:
        i, j = rng.randrange(len(new)), rng.randrange(len(new))
        new[i], new[j] = new[j], new[i]
    return new


def changed_text(old, rng):
    if re.fullmatch(r"\d+:[-0+]", old):
        position, sign = old.split(":")
        return f"{position}:{rng.choice('-0+')}" if rng.random() < 0.6 else f"{near(int(position), rng)}:{sign}"
    if re.fullmatch(r"\d+\^\d+", old):
        position, power = old.split("^")
        return f"{near(int(position), rng)}^{power}" if rng.random() < 0.5 else f"{position}^{near(int(power), rng)}"
    if re.fullmatch(r"\d+\*?", old):
        if rng.random() < 0.2:
            return old[:-1] if old.endswith("*") else old + "*"
        return str(near(int(old.rstrip("*")), rng)) + ("*" if old.endswith("*") else "")
    if re.fullmatch(r"-?\d+p-?\d+", old):
        mantissa, exponent = map(int, old.split("p"))
        return rng.choice([f"{-mantissa}p{exponent}", f"{mantissa + rng.choice([-1, 1, 2**20, 2**60])}p{exponent}", f"{mantissa}p{near(exponent, rng)}", "0"])
    if re.fullmatch(r"-?\d+(/\d+)?", old):
        return changed_number(Fraction(old), rng)
    if old in ("< 0", "<= 0", "= 0", ">= 0", "> 0", "!= 0"):
        return rng.choice(["< 0", "<= 0", "= 0", ">= 0", "> 0", "!= 0"])
    return rng.choice([old + "1", "", "x0", "x1", "t"])


def near(value, rng):
    return value + rng.choice([-1, 1, 1, 2]) if rng.random() < 0.8 else value * 2


def changed_number(value, rng):
    small = Fraction(1, rng.choice([2, 10, 1000, 10**6, 10**12]))
    new = rng.choice([-value, value + 1, value - 1, value * 2, value / 2, value * (1 + small), value * (1 - small), value + small, value - small, Fraction(0)])
    return str(new)
