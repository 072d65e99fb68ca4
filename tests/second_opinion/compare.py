"""python compare.py KEEPOUT-CHECK [CORPUS] [--mutants N] [--seed S]: compares the answers of keepout-check and check.py.

Every case of the corpus (a line, then a certificate, which carries its statement) and N mutants of accepted ones. A mutant is
given as a certificate for its own statement or for the one it was made from. Prints each difference on accept / not accept;
differences among the other answers are counted, and so are certificates that keepout-check
accepts only with more bits, more Taylor terms and better centres. Exit status 1 if there is a difference. `--save FOLDER` keeps differing mutants.
`--pairs FOLDER` compares NAME.statement.json with NAME.certificate.json in a folder instead, for all names,
and makes mutants of these.
"""

import argparse
import json
import random
import signal
import subprocess
import sys
import tempfile
from collections import Counter
from pathlib import Path

import flint
from answer import Answer
from certificate import read_family
from check import check
from mutation import mutant
from roots import Roots

WORDS = {0: "verified", 1: "refuted", 2: "inconclusive", 3: "malformed", 4: "not covered"}
SECONDS = 120


class TooSlow(Exception):
    pass


def stop(*_):
    raise TooSlow


def second(statement, certificate):
    """Status and words of check.py."""
    signal.signal(signal.SIGALRM, stop)
    signal.alarm(SECONDS)
    try:
        check(statement, certificate)
        return 0, "verified"
    except Answer as answer:
        return answer.status, str(answer)
    except TooSlow:
        return 5, f"no answer in {SECONDS} s"
    finally:
        signal.alarm(0)


def first(program, statement, certificate, folder):
    """Status and words of keepout-check."""
    paths = [Path(folder) / name for name in ("statement.json", "certificate.json")]
    for path, text in zip(paths, (statement, certificate)):
        path.write_bytes(text)
    run = subprocess.run([program, *map(str, paths)], capture_output=True, text=True, check=False)
    return run.returncode, reason(run.stdout + run.stderr)


def reason(words):
    """The line of the answer that says why."""
    lines = [line.strip() for line in words.splitlines() if line.strip()]
    return " / ".join(lines[-2:])[:300]


def cases(corpus):
    """Path and certificate of each case."""
    for path in sorted(corpus.rglob("*.case")):
        yield path, path.read_text(encoding="utf-8").split("\n", 1)[1]


class Comparison:
    def __init__(self, program, folder, save):
        self.program, self.folder, self.save = program, folder, save
        self.counts, self.kinds, self.differences = Counter(), Counter(), 0

    def compare(self, name, statement, certificate):
        """Compares the answers to one certificate."""
        ours, why = second(statement, certificate)
        theirs, words = first(self.program, statement, certificate, self.folder)
        if ours in (4, 5):
            self.counts[WORDS.get(ours, "too slow")] += 1
            return
        self.counts["compared"] += 1
        self.kinds[WORDS.get(theirs, f"status {theirs}"), WORDS[ours]] += 1
        if ours == 0 and theirs == 2 and self.accepts_sharper(certificate):
            self.counts["only accepted by keepout-check with more bits, terms, better centres"] += 1
            print(f"PRECISION {name}: keepout-check: {words}", flush=True)
        elif (ours == 0) != (theirs == 0):
            self.differences += 1
            print(f"DIFFERENT {name}\n  keepout-check: {theirs} {words}\n  check.py: {ours} {why}", flush=True)
            self.keep(statement, certificate)

    def accepts_sharper(self, certificate):
        """Whether keepout-check accepts, if the certificate names more bits, more Taylor terms and better centres: the difference is one of precision."""
        value = json.loads(certificate)
        value["bits"] = str(int(value["bits"]) + 64)
        with flint.ctx.workprec(int(value["bits"]) + 20):
            roots = iter(Roots(tuple(map(read_family, value["families"])), int(value["bits"])).all)
            for family in value["families"]:
                family["centres"] = [centre(next(roots)) for _ in family["centres"]]
        evidence = next(iter(value["evidence"].values()))
        cells = evidence.get("cells", []) + evidence.get("before", []) + [evidence.get("cell", {"order": "1"})]
        for cell in cells:
            cell["order"] = str(min(int(cell["order"]) + 20, 400))
        certificate = json.dumps(value).encode()
        return first(self.program, own_statement(certificate), certificate, self.folder)[0] == 0

    def keep(self, statement, certificate):
        if self.save:
            self.save.mkdir(parents=True, exist_ok=True)
            (self.save / f"{self.differences}.statement.json").write_bytes(statement)
            (self.save / f"{self.differences}.certificate.json").write_bytes(certificate)

    def report(self, title):
        print(f"{title}: " + ", ".join(f"{n} {word}" for word, n in self.counts.items()) + f", {self.differences} different")
        for (theirs, ours), n in sorted(self.kinds.items()):
            print(f"  keepout-check {theirs}, check.py {ours}: {n}")


def centre(root):
    """The middle of a root's box, as a centre of a certificate."""
    return {part: "{}p{}".format(*value.mid().man_exp()) for part, value in (("re", root.box.real), ("im", root.box.imag))}


def own_statement(certificate):
    return json.dumps(json.loads(certificate)["statement"]).encode()


def compare_corpus(comparison, corpus):
    for path, text in cases(corpus):
        try:
            statement = own_statement(text)
        except (ValueError, KeyError, TypeError):
            statement = b"{}"
        comparison.compare(path.relative_to(corpus), statement, text.encode())
    comparison.report("corpus")


def compare_mutants(comparison, accepted, number, seed):
    accepted = [(path, text) for path, text in accepted if second(own_statement(text), text.encode())[0] == 0]
    for i in range(number):
        rng = random.Random(f"{seed}/{i}")
        path, text = rng.choice(accepted)
        value, what = mutant(json.loads(text), rng)
        certificate = json.dumps(value).encode()
        # A mutant for the statement that it was made from is mostly for another one, so that is rarely worth a run.
        same = rng.random() < 0.05 or not isinstance(value.get("statement"), dict)
        statement = own_statement(text if same else certificate)
        comparison.compare(f"mutant {i} of {path.name}: {what}", statement, certificate)
    comparison.report("mutants")


def compare_pairs(comparison, folder):
    for path in sorted(folder.rglob("*.statement.json")):
        other = path.with_name(path.name.replace(".statement.json", ".certificate.json"))
        if other.exists():
            comparison.compare(path.relative_to(folder), path.read_bytes(), other.read_bytes())
    comparison.report("pairs")


def main():
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("program")
    parser.add_argument("corpus", nargs="?", type=Path, default=Path(__file__).parent.parent / "corpus")
    parser.add_argument("--mutants", type=int, default=0)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--save", type=Path)
    parser.add_argument("--pairs", type=Path)
    given = parser.parse_args()
    with tempfile.TemporaryDirectory() as folder:
        plain = Comparison(given.program, folder, given.save)
        mutants = Comparison(given.program, folder, given.save and given.save / "mutants")
        if given.pairs:
            compare_pairs(plain, given.pairs)
            accepted = [(path, path.read_text(encoding="utf-8")) for path in sorted(given.pairs.rglob("*.certificate.json"))]
        else:
            compare_corpus(plain, given.corpus)
            accepted = list(cases(given.corpus / "accept"))
        if given.mutants:
            compare_mutants(mutants, accepted, given.mutants, given.seed)
    return 1 if plain.differences + mutants.differences else 0


if __name__ == "__main__":
    sys.exit(main())
