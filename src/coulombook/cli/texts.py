"""The words of the help: an overview, and for each command what it does, with examples.

They stand apart from the commands so that the overview need not load any of these.
"""

OVERVIEW = """\
Faradaic-efficiency ledgers for CO2 electrolysis: from a day's bench files to a
charge balance with honest uncertainty."""

EXAMPLES = """\
examples:
  coulombook new "2043-05-18 mesh"      lay out an empty, commented day folder
  coulombook check "2043-05-18 mesh"    see what would be computed, and what is missing
  coulombook tally "2043-05-18 mesh"    compute the ledgers into its folder 'results'
  coulombook explain "2043-05-18 mesh"  see why its balance does not close
  coulombook budget "2043-05-18 mesh"   see where its uncertainty comes from
  coulombook figures "2043-05-18 mesh"  draw it for print
  coulombook compare "2043-05-18 mesh"  see which catalyst is better, and how surely
  coulombook curves                     see the calibration curves in ./calibrations
  coulombook show "2043-05-18 mesh"     see its results once more

Each command has its own help: coulombook tally --help

exit status: 0 done; 1 the day's data have faults (all are listed, nothing is
written); 2 wrong option or missing file; 3 a fault of coulombook itself"""

# name: (in a line, in a paragraph, examples), in the order of the overview
COMMANDS = {
    "tally": (
        "compute the ledgers of a day",
        """\
Read a day folder and write its Faradaic-efficiency ledgers, as CSV with a
manifest. The results are written whole or not at all; the day's own files are
never touched.""",
        """\
examples:
  coulombook tally "2043-05-18 mesh"
  coulombook tally "2043-05-18 mesh" --out ledgers --calibrations ~/gc --calibrations ~/nmr
  coulombook tally "2043-05-18 mesh" --draws 200000 --seed 7
  coulombook tally "2043-05-18 mesh" --tables-only
  coulombook tally "2043-05-18 mesh" --strict --quiet && echo fit to publish""",
    ),
    "check": (
        "say what would be computed and what is missing",
        """\
Read a day folder, say what would be computed and what is missing, and list
every fault. Nothing is written.""",
        """\
example:
  coulombook check "2043-05-18 mesh" """,
    ),
    "explain": (
        "say why a balance does not close",
        """\
Say how each run and the day as a whole close, and what explains it if they do
not: candidate causes with their size, their evidence, and the test at the bench
that would decide. Nothing is written.""",
        """\
example:
  coulombook explain "2043-05-18 mesh" """,
    ),
    "budget": (
        "say where an uncertainty comes from",
        """\
Say which source contributes what to the variance of an output, largest first:
over the day (the mean of its runs) or for one run. Nothing is written.""",
        """\
examples:
  coulombook budget "2043-05-18 mesh"                     total FE, mean over the runs
  coulombook budget "2043-05-18 mesh" --product C2H4      FE of one product
  coulombook budget "2043-05-18 mesh" --run m1-3 --product "C2+/C1" """,
    ),
    "compare": (
        "compare catalysts, of one day or of several",
        """\
Compare the catalysts of one day or of several: at levels and at common
potentials, on the geometric and on the real area, with intervals in which shared
errors cancel, a ranking that says where the data cannot tell, and the rank
correlation of selectivity with roughness.""",
        """\
examples:
  coulombook compare "2043-05-18 mesh"
  coulombook compare "2043-05-18 mesh" "2043-05-25 mesh" --one-error "outlet flow"
  coulombook compare "2043-05-18 mesh" --product C2H4 --at -0.95,-1.05
  coulombook compare "2043-05-18 mesh" --closed --basis real --out comparison""",
    ),
    "new": (
        "lay out an empty day folder",
        """\
Lay out an empty day folder: every table with its heads and units, and a
commented day.toml. A folder that holds something already is left alone.""",
        """\
examples:
  coulombook new "2043-05-18 mesh"              tables as CSV files
  coulombook new "2043-05-18 mesh" --workbook   tables as sheets of day.xlsx""",
    ),
    "figures": (
        "draw publication figures of a day",
        """\
Draw a day: figures fit to print, and the table of each as CSV beside it. They go
into a folder of their own, written whole or not at all; the same day gives the
same files. What to draw may be named with --only:

  fe                Faradaic efficiencies of each catalyst against potential
  partial-currents  partial current densities, on geometric and real area
  selectivity       C2+/C1 of all catalysts against potential
  closure           total Faradaic efficiency of each run
  budget            what the uncertainty of the total comes from
  trace             the log of each run, with its injections
  curve             each calibration curve used, with its residuals
  capacitance       charging current of each electrode against scan rate
  spectrum          each impedance spectrum""",
        """\
examples:
  coulombook figures "2043-05-18 mesh"
  coulombook figures "2043-05-18 mesh" --only fe --only selectivity --width 178mm
  coulombook figures "2043-05-18 mesh" --format png --out slides""",
    ),
    "curves": (
        "show and compare calibration curves",
        """\
Show the calibration curves at hand: all of them; one of them, with its
uncertainty, limits, verdicts and a plot; or several against each other, with
their drift.

A NAME is a curve, such as ethylene@FID (the analyte by any of its names or its
formula), gc-2043-04/ethylene@FID for one calibration's, or a calibration.""",
        """\
examples:
  coulombook curves                            all curves in ./calibrations
  coulombook curves --calibrations ~/gc --on 2043-06-30
  coulombook curves C2H4@FID                   one curve, and its drift if there are several
  coulombook curves C2H4@FID --figure ethylene.svg
  coulombook curves gc-2042-09 gc-2043-04      every curve of two calibrations compared
  coulombook curves C2H4@FID gc-2042-09 gc-2043-04
  coulombook curves C2H4@FID --checks "2043-05-18 mesh"    its check injections charted""",
    ),
    "show": (
        "show results once more, or one run of them",
        """\
Show the results of a day as they were written, without computing anything: the
whole day, one run, or one of the tables. Files that were changed since are named.""",
        """\
examples:
  coulombook show "2043-05-18 mesh"
  coulombook show "2043-05-18 mesh" --run m1-3
  coulombook show "2043-05-18 mesh" --table series
  coulombook show "2043-05-18 mesh" --table ledger --plain | sort -k 6""",
    ),
    "again": (
        "compute results anew and compare to the bit",
        """\
Verify a results folder: that its files are as they were written, that the files
of the day are the ones they were made from, and that computing them anew, with
the same options, gives the same to the bit. Nothing is written. Ends with status
1 if anything differs.""",
        """\
examples:
  coulombook again "2043-05-18 mesh"
  coulombook again ledgers --day "2043-05-18 mesh" --calibrations ~/gc""",
    ),
    "why": (
        "explain a kind of finding",
        """\
Show what a fault, warning or note means, why it matters to the numbers, what to
do, and an example of a day's files with it and without it. Without a KIND, list
them all.""",
        """\
examples:
  coulombook why                     every kind, in a line
  coulombook why balance-open        one of them
  coulombook why "error[duplicate]"  one as it stands on the terminal""",
    ),
    "completion": (
        "print a script that completes commands in a shell",
        """\
Print the script by which a shell completes commands, options and folders.""",
        """\
examples:
  coulombook completion bash > ~/.local/share/bash-completion/completions/coulombook
  coulombook completion zsh > ~/.zfunc/_coulombook""",
    ),
}
