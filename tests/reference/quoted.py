"""The values quoted in docs/references.md, to the digits quoted there: the derived ones must agree with every one of them."""

from fractions import Fraction as F

SUPREMA = {
    "damping ratio 1/10": "1.7292476143", "damping ratio 1/5": "1.5266205993", "damping ratio 3/10": "1.3723261049",
    "damping ratio 1/2": "1.1630335348", "damping ratio 3/5": "1.09478022484", "damping ratio 4/5": "1.01516461986",
    "6 s + 25": "1.094780224842154852791022",
    "bessel 2": "1.004333420509983129219222", "bessel 3": "1.007537465921002284652380", "bessel 4": "1.008354199514349140279336",
    "bessel 5": "1.007726835779157040661389", "bessel 6": "1.006418399352149921930337",
    "butterworth 3": "1.081465441446006687607027",
    "itae 2": "1.045987910260267739208997", "itae 3": "1.019803419954163560839170",
    "itae 4": "1.019251774602542707100180", "itae 5": "1.021029056234903039288544",
}
NORMS = {
    "damping ratio 3/10": "2.186367978", "damping ratio 1/2": "1.389582", "damping ratio 3/5": "1.209408207", "damping ratio 4/5": "1.030796253",
    "bessel 2": "1.008704562", "bessel 3": "1.016191296", "bessel 4": "1.019253369", "bessel 5": "1.01908266", "bessel 6": "1.017037095",
    "butterworth 3": "1.198042518",
}
TIMES = {"butterworth 3": "4.92221650740"}
ABSCISSAE = {
    "building_A.mtx": "-0.26180", "dlr_A.mtx": "-0.0049756", "jetengine_A.mtx": "-0.18240", "distillation_A.mtx": "-0.00012152",
    "iss_A.mtx": "-0.0031173", "cdplayer_A.mtx": "-0.024344",
    "heat 200": "-0.0986940348", "pde": "-353.3908", "fom": "-1",
}


def agree(pair, quoted):
    """Whether the pair lies within one unit of the last digit quoted."""
    unit = F(1, 10 ** len(quoted.partition(".")[2]))
    return all(abs(F(end) - F(quoted)) <= unit for end in pair)


def disagreements(values):
    """The quoted values that the derived ones contradict, or that are missing."""
    steps = {case["name"]: case for case in values["step_responses"]}
    models = {case["model"]: case for case in values["spectra"]}
    for table, cases, key in ((SUPREMA, steps, "supremum"), (NORMS, steps, "impulse_l1"), (TIMES, steps, "time"), (ABSCISSAE, models, "abscissa")):
        for name, quoted in table.items():
            if name not in cases or not agree(cases[name][key], quoted):
                yield f"{name}, {key}: {quoted} quoted, {cases.get(name, {}).get(key)} derived"
