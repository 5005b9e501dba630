"""The validation record as text with tables."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from typing import Any

Record = Mapping[str, Any]


def validation_text(record: Record) -> str:
    """Return the record as Markdown.

    Parameters
    ----------
    record : of format ``branchpos.validation/1``.
    """
    parts = [
        _opening(record),
        _known_section(record),
        _coverage_section(record),
        _errors_section(record["confident_errors"]),
        _index_section(record["index"]),
        _yardstick_section(record["yardsticks"]),
        _others_section(record["others"]),
        _retention_section(record["retention"]),
        _fits_section(record["fits"]),
        _records_section(record["records"]),
    ]
    return "\n\n".join(part for part in parts if part) + "\n"


def _opening(record: Record) -> str:
    data, versions = record["data"], record["versions"]
    listed = ", ".join(f"{name} {number}" for name, number in versions.items())
    return "\n".join(
        [
            "# Validation on spectra of known structure",
            "",
            f"Made by `{record['command']}` on {record['date']}, branchpos {record['program']} ({listed}).",
            "",
            f"- Spectra: {data['spectra']}; {data['known_spectra']} records of {data['known_compounds']} "
            f"alkanes, of which {data['branched_compounds']} are branched.",
            *([f"- Indices: {data['indices']}."] if data["indices"] else []),
            f"- Held out: {record['held_out']}.",
            f"- Prior {record['settings']['prior']}, credible sets at {record['settings']['level']:g}.",
        ]
    )


def _known_section(record: Record) -> str:
    straight = record["summary"]["unbranched"]
    number = straight["records"]
    rows = [
        ("an unbranched chain first", straight["unbranched_first"], number),
        ("unbranched at 0.9 or more", straight["unbranched_at_0.9"], number),
        ("branched at 0.9 or more (false claim)", straight["branched_at_0.9"], number),
        ("the right number of carbons first", straight["right_size_first"], number),
        ("truth in the credible set", straight["truth_in_set"], number),
    ]
    text = [
        "## Unbranched alkanes",
        "",
        _table(("what", "records", "of"), rows),
        "",
        "## Branched alkanes",
        "",
    ]
    branched = [
        (flag, one["records"], one["truth_first"], one["truth_in_set"], one["unbranched_at_0.9"])
        for flag, one in record["summary"]["branched"].items()
    ]
    heads = (
        "quality of the record",
        "records",
        "truth first",
        "truth in the credible set",
        "called unbranched",
    )
    return "\n".join([*text, _table(heads, branched)])


def _coverage_section(record: Record) -> str:
    rows = [
        (
            f"{one['level']:g}",
            f"{one['unbranched']} of {one['unbranched_records']}",
            f"{one['branched']} of {one['branched_records']}",
        )
        for one in record["coverage"]
    ]
    return "## Credible sets that hold the truth\n\n" + _table(("level", "unbranched", "branched"), rows)


def _errors_section(errors: Sequence[Record]) -> str:
    if not errors:
        return "## Confident errors\n\nNone."
    rows = [
        (one["accession"], one["quality"], one["truth"], one["evidence"], one["error"],
         _chance(one["posterior_of_truth"]))
        for one in errors
    ]  # fmt: skip
    heads = ("record", "quality", "truth", "evidence", "said", "probability of the truth")
    return "## Confident errors\n\n" + _table(heads, rows)


def _index_section(index: Record | None) -> str:
    if index is None:
        return ""
    rows = []
    for kind in ("all", "unbranched", "branched"):
        if kind not in index:
            continue
        one = index[kind]
        size, chance = one["mean_set_size"], one["mean_posterior_of_truth"]
        rows.append(
            (
                kind,
                one["records"],
                f"{size['alone']:.2f} to {size['with_index']:.2f}",
                f"{chance['alone']:.3f} to {chance['with_index']:.3f}",
                f"{one['sets_smaller']} / {one['sets_larger']}",
                f"{one['truth_rose']} / {one['truth_fell']}",
            )
        )
    heads = ("records", "number", "mean credible set", "mean probability of the truth",
             "sets smaller / larger", "truth rose / fell")  # fmt: skip
    without = ", ".join(index["no_index_known_for"]) or "none"
    return "\n".join(
        [
            "## What a retention index adds",
            "",
            "The index is the measured one, or 100 times the carbons of an n-alkane, with a standard "
            "deviation of 1 unit.",
            f"Left aside, as nobody measured them here: {without}.",
            "",
            _table(heads, rows),
        ]
    )


def _yardstick_section(yardsticks: Record) -> str:
    rows = [
        (
            kind,
            one["records"],
            one["program_right_first"],
            one["nearest_right"],
            one["ion_count_right"],
            f"{one['mean_ion_count_rank']:.1f} of {one['mean_candidates']:.0f}",
            f"{one['mean_rank_among_alike']:.1f} of {one['mean_alike']:.0f}",
        )
        for kind, one in yardsticks.items()
    ]
    heads = ("records", "number", "branchpos right first", "nearest spectrum right", "ion count right",
             "mean rank by ion count", "the same, told the number of methyls")  # fmt: skip
    return "\n".join(
        [
            "## Against two simple yardsticks",
            "",
            "Nearest spectrum: the record of another compound with the highest cosine of root intensities; "
            "right where its methyls sit alike. Ion count: chains of the true size ranked by how many ions "
            "from cleavage beside a branch are present, ties at their middle.",
            "",
            _table(heads, rows),
        ]
    )


def _others_section(others: Record | None) -> str:
    if others is None:
        return ""
    statuses = [(status, count) for status, count in others["statuses"].items()]
    lines = [
        "## Other compounds",
        "",
        f"{others['records']} spectra of compounds that are no methyl-branched or straight alkanes; none "
        "took part in a fit. Any claim of a chain is a false one.",
        "",
        _table(("status", "spectra"), statuses),
    ]
    if others["claims"]:
        rows = [
            (one["accession"], one["title"], one["formula"], one["status"], one["first"],
             _chance(one["first_posterior"]), _chance(one["none_of_these"]))
            for one in others["claims"]
        ]  # fmt: skip
        heads = (
            "record",
            "compound",
            "formula",
            "status",
            "leading chain",
            "its probability",
            "none of these",
        )
        lines += ["", "Each claim:", "", _table(heads, rows)]
    if others["not_judged"]:
        lines += [
            "",
            "Not judged: " + "; ".join(f"{o['accession']} ({o['fault']})" for o in others["not_judged"]),
        ]
    return "\n".join(lines)


def _retention_section(retention: Record | None) -> str:
    if retention is None:
        return ""
    rows = [
        (
            methyls,
            f"{one['median_error']:.2f}",
            f"{one['rms_error']:.2f}",
            f"{100 * one['coverage_95']:.0f} %",
        )
        for methyls, one in retention["by_methyls"].items()
    ]
    heads = ("methyls", "median absolute error", "root mean square error", "inside 95 % interval")
    lines = [
        "## Retention indices of compounds left out",
        "",
        "Ten random splits in ten parts by compound; index units.",
        "",
        _table(heads, rows),
        "",
        f"Inside the 95 % interval over all: {100 * retention['coverage_95']:.1f} %.",
    ]
    suspects = [
        (one["name"], f"{one['measured']:g}", f"{one['residual']:+.1f}", f"{one['z']:+.1f}")
        for one in retention["suspects"]
    ]
    if suspects:
        heads_of = ("doubted value", "measured", "less predicted", "in standard deviations")
        lines += ["", _table(heads_of, suspects)]
    return "\n".join(lines)


def _fits_section(fits: Record) -> str:
    rows = [
        (
            one["name"],
            len(one["accessions"]),
            "none" if not one["refitted"] else "no former fit" if one["cold"] else "fit to all",
            one["iterations"],
            f"{one['last_move']:.3f}",
        )
        for one in fits["compounds"]
    ]
    heads = ("left out", "records", "fit begun from", "iterations", "last move [standard errors]")
    lines = ["## Fits", "", _table(heads, rows)]
    for one in fits["starts"]:
        lines += [
            "",
            f"Begun from the fit to all and from no fit, the fits without {one['name']} differ by at most "
            f"{one['largest_move']:.2f} standard errors in any parameter; the truth gets "
            f"{_chance(one['posterior_warm'])} and {_chance(one['posterior_cold'])}.",
        ]
    return "\n".join(lines)


def _records_section(records: Sequence[Record]) -> str:
    rows = [
        (
            one["accession"],
            one["shorthand"],
            one["quality"],
            one["alone"]["status"],
            one["alone"]["call"],
            one["alone"]["rank"] or "not tried",
            _chance(one["alone"]["posterior"]),
            one["alone"]["set_size"],
            _chance(one["with_index"]["posterior"]) if one["with_index"] else "",
        )
        for one in records
    ]
    heads = ("record", "truth", "quality", "status", "call", "rank of the truth", "its probability",
             "credible set", "with index")  # fmt: skip
    return "## Every record\n\n" + _table(heads, rows)


def _table(heads: Sequence[str], rows: Iterable[Sequence[object]]) -> str:
    lines = [heads, ["---"] * len(heads), *([str(cell).replace("|", "\\|") for cell in row] for row in rows)]
    return "\n".join("| " + " | ".join(line) + " |" for line in lines)


def _chance(probability: float) -> str:
    return f"{probability:.3f}" if probability >= 0.001 or probability == 0 else f"{probability:.0e}"
