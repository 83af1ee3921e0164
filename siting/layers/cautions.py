"""What every report and run record says before anyone builds."""

GENERAL_CAUTIONS = (
    "This is a screening from maps: walk every place before you decide, and ask who uses its land and water now.",
    "A flood can exceed any figure given here.",
    "Whatever stores or diverts water can fail and harm people below; it may need a permit, and must be designed under "
    "local codes by licensed practice.",
    "Rights to land and water come first; a plot upstream takes what a field downstream now receives.",
    "Standing water breeds mosquitoes and can salt the soil: test soil and water.",
    "Low ground may have shallow groundwater, or no air for roots: dig before you plant.",
    "Banks, dams and diversions upstream that no map shows take the water first: ask.",
)
"""In the order of reading; every run says all of them."""

NO_EXCLUSIONS_CAUTION = "No layer of roads, houses or fields was given, so none was left out."
