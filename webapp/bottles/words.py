"""What the kinds of bottles, analyses and reasons are called; the keys are stored and exported."""

ANALYSES = {
    "bod5": "BOD, 5 days",
    "cbod5": "CBOD, 5 days (nitrification inhibited)",
    "ubod": "Ultimate BOD (long series)",
    "nh3_n": "Ammonia nitrogen",
    "chlorophyll_a": "Chlorophyll a",
    "winkler_do": "Oxygen by titration (fixed on site)",
    "conductance_lab": "Conductance in the laboratory",
}
# What a result is given in, as UCUM codes; webapp.bottles.shown says how they are written.
UNITS = {name: "mg/L" for name in ANALYSES} | {"chlorophyll_a": "ug/L", "conductance_lab": "uS/cm"}
UNIT_LABELS = {"mg/L": "mg/L", "ug/L": "µg/L", "uS/cm": "µS/cm"}
KINDS = {"sample": "Sample", "replicate": "Replicate of another bottle", "blank": "Blank (clean water)"}
POSITIONS = {
    "": "Not noted",
    "left": "Left, looking downstream",
    "centre": "Centre",
    "right": "Right, looking downstream",
}
FULL = {"": "Not noted", "yes": "Full, no air under the stopper", "no": "With air under the stopper"}
CENSORS = {"none": "a number", "less_than": "less than the limit", "greater_than": "more than the limit"}
SIGNS = {"none": "", "less_than": "<", "greater_than": ">"}
QUALITIES = {
    "not_checked": "nothing is odd",
    "questionable": "something is odd or not shown: see the reasons",
    "missing": "no result yet",
}
REASONS = {
    "past_hold_time": "it waited longer than its analysis allows",
    "hold_time_unknown": "how long it waited is not told",
    "warm_on_receipt": "it reached the laboratory warm",
    "frozen_on_receipt": "it may have frozen on the way",
    "not_on_ice": "it was put on ice late",
    "headspace": "there was air under the stopper",
    "lab_control_failed": "a control of the laboratory failed",
    "replicate_differs": "its replicate differs by more than usual",
    "below_limit": "below the reporting limit",
}
# What a check is called in the code, and the reason it gives here.
REASON_OF = {name: name for name in REASONS} | {
    "bottle_replicate": "replicate_differs",
    "depletion_low": "lab_control_failed",
    "residual_low": "lab_control_failed",
    "incubation_time": "lab_control_failed",
    "incubation_temperature": "lab_control_failed",
}
# What says where a number comes from, and nothing against it.
TELLING = ("below_limit",)
# The laboratory's own checks of a run, as LabResult.quality keeps them: what each is called, its unit and its limits.
CONTROLS = {
    "blank_mg_l": ("Blank: oxygen used up", "mg/L", -5, 20),
    "gga_mg_l": ("Glucose-glutamic acid check: BOD found", "mg/L", 0, 2000),
    "depletion_mg_l": ("Oxygen used up in the dilution", "mg/L", -5, 30),
    "residual_mg_l": ("Oxygen left in the dilution", "mg/L", -0.5, 30),
    "incubation_c": ("Temperature of the incubator", "°C", -5, 60),
}
