"""Prints matrices in the forms that people paste, with the numbers they came from.

Usage: python make.py (NumPy 2). Writes one .txt a form and expected.json beside it.
The expected numbers are the doubles that Python reads from its own output, so they
share nothing with the parser under test. The matrices are invented.
"""

import json
import pathlib

import numpy as np

HERE = pathlib.Path(__file__).parent
RNG = np.random.default_rng(20240)
expected = {}


def matrix():
    m = RNG.uniform(-0.6, 0.6, (4, 4))
    m[0, 0] = 1.0
    return m


def write(name, text, matrices, labels=None, decimals="unchecked", encoding="utf-8", **more):
    (HERE / f"{name}.txt").write_bytes(text.encode(encoding))
    matrices = np.asarray(matrices, dtype=float).reshape(-1, 16)
    expected[name] = {"matrices": matrices.tolist()}
    if labels is not None:
        expected[name]["labels"] = labels
    if decimals != "unchecked":
        expected[name]["decimals"] = decimals
    expected[name].update(more)


def printed(m, form="%.4f"):
    """The texts of the elements, and the numbers that they say."""
    texts = [[form % x for x in row] for row in m]
    return texts, [float(t) for row in texts for t in row]


one = matrix()
texts, said = printed(one)
comma = [[t.replace(".", ",") for t in row] for row in texts]
rows = lambda cells, between: [between.join(row) for row in cells]

# Spreadsheets.
write("tsv_crlf", "\r\n".join(rows(texts, "\t")) + "\r\n", said, decimals=4)
write("tsv_decimal_comma", "\r\n".join(rows(comma, "\t")) + "\r\n", said, decimals=4)
write("tsv_bom", "\ufeff" + "\n".join(rows(texts, "\t")), said, decimals=4)
write("tsv_old_mac", "\r".join(rows(texts, "\t")) + "\r", said, decimals=4)
write("csv", "\n".join(rows(texts, ",")) + "\n", said, decimals=4)
write("csv_space", "\n".join(rows(texts, ", ")) + "\n", said, decimals=4)
write("csv_trailing_comma", "\n".join(r + "," for r in rows(texts, ",")) + "\n", said)
write("csv_semicolon", "\r\n".join(rows(texts, ";")) + "\r\n", said, decimals=4)
write("csv_semicolon_decimal_comma", "\r\n".join(rows(comma, ";")) + "\r\n", said, decimals=4)
write("csv_comma_space_decimal_comma", "\n".join(rows(comma, ", ")) + "\n", said, decimals=4)
write("csv_sep_line", "sep=;\r\n" + "\r\n".join(rows(comma, ";")) + "\r\n", said, decimals=4)
quoted = [[f'"{t}"' for t in row] for row in texts]
write("csv_quoted", "\r\n".join(rows(quoted, ",")) + "\r\n", said, decimals=4)
quoted_comma = [[f'"{t}"' for t in row] for row in comma]
write("csv_quoted_decimal_comma", "\r\n".join(rows(quoted_comma, ",")) + "\r\n", said, decimals=4)
head = ["c1", "c2", "c3", "c4"]
write("tsv_header", "\n".join(["\t".join(head)] + rows(texts, "\t")), said, [None])
labelled = [[f"row {k}"] + row for k, row in enumerate(texts)]
write("csv_header_and_row_labels", "\n".join(["," + ",".join(head)] + rows(labelled, ",")), said)

# White space, signs and spaces of typesetting.
write("whitespace", "\n".join(rows(texts, "   ")), said, decimals=4)
write("whitespace_decimal_comma", "\n".join(rows(comma, "  ")), said, decimals=4)
write("whitespace_padded", "\n\n  " + "  \n  ".join(rows(texts, "\t ")) + "  \n\n\n", said)
write("unicode_minus", "\n".join(rows(texts, "\u00a0\u2009")).replace("-", "\u2212"), said, decimals=4)
write("full_width_digits", "\n".join(rows(texts, "\t")).translate(
    {ord("0") + k: 0xFF10 + k for k in range(10)}), said)
write("arabic_indic_digits", "\n".join(rows(texts, "\t")).translate(
    {ord("0") + k: 0x660 + k for k in range(10)} | {ord("."): "\u066b"}), said)
write("air_between_rows", "\n\n".join(rows(texts, " ")), said)
write("framed", "\n".join(f"| {r} |" for r in rows(texts, " | ")), said)
bare = [t.replace("0.", ".") for row in texts for t in row]
write("bare_points", " ".join(bare[:4]) + "\n" + " ".join(bare[4:8]) + "\n"
      + " ".join(bare[8:12]) + "\n" + " ".join(bare[12:]), said)

# Flat ones.
flat = [t for row in texts for t in row]
write("row_of_sixteen", "\t".join(flat) + "\n", said, decimals=4)
write("row_of_sixteen_decimal_comma", ";".join(t for row in comma for t in row), said)
write("column_of_sixteen", "\n".join(flat) + "\n", said)
write("column_with_names", "\n".join(f"m{k // 4}{k % 4} {t}" for k, t in enumerate(flat)), said)
write("wrapped_run", " ".join(flat[:6]) + "\n" + " ".join(flat[6:12]) + "\n" + " ".join(flat[12:]), said)
many = [matrix() for _ in range(5)]
many_said = [printed(m)[1] for m in many]
many_flat = ["\t".join(t for row in printed(m)[0] for t in row) for m in many]
write("rows_of_sixteen", "\r\n".join(many_flat) + "\r\n", many_said)
names = [f"film {c}" for c in "ABCDE"]
write("rows_of_sixteen_labels", "\n".join(n + "\t" + r for n, r in zip(names, many_flat)), many_said, names)
header = "\t".join(["sample"] + [f"m{k // 4}{k % 4}" for k in range(16)])
write("rows_of_sixteen_header", "\n".join([header] + [n + "\t" + r for n, r in zip(names, many_flat)]), many_said, names)
write("rows_of_four", "\n".join(r for m in many for r in rows(printed(m)[0], "\t")), many_said)
write("blank_lines_between", "\n\n".join("\n".join(rows(printed(m)[0], " ")) for m in many), many_said)
write("comments_between", "\n".join(f"# {n}\n" + "\n".join(rows(printed(m)[0], " ")) for n, m in zip(names, many)), many_said, names)
write("titles_between", "\n".join(f"{n}:\n" + "\n".join(rows(printed(m)[0], "\t")) + "\n" for n, m in zip(names, many)), many_said, names)
write("numbered_titles", "\n".join(f"Film {k}\n" + "\n".join(rows(printed(m)[0], " ")) for k, m in enumerate(many)), many_said, [f"Film {k}" for k in range(5)])
write("wavelength_titles", "\n".join(f"{450 + 10 * k} nm\n" + "\n".join(rows(printed(m)[0], " ")) for k, m in enumerate(many)), many_said, [f"{450 + 10 * k} nm" for k in range(5)])
write("comment_marks", "% from the bench\n// kelp\n" + "\n".join(r + "  # row" for r in rows(texts, " ")), said)
write("column_of_many", "\n".join(t for m in many for row in printed(m)[0] for t in row), many_said)

# Python and NumPy.
full = matrix()
write("python_list", repr(full.tolist()), full)
write("python_list_lines", "[" + ",\n ".join(repr(r) for r in full.tolist()) + "]", full)
write("python_flat", repr(full.ravel().tolist()), full)
write("python_flat_lines", "[\n" + "".join(f"  {x!r},\n" for x in full.ravel().tolist()) + "]\n", full)
write("python_tuples", repr(tuple(map(tuple, full.tolist()))), full)
write("python_list_of_tuples", repr(list(map(tuple, full.tolist()))), full)
write("python_named", "M = np.array(" + repr(full.tolist()) + ")\n", full, ["M"])
write("python_reshape", "m = np.array(" + repr(full.ravel().tolist()) + ").reshape(4, 4)\n", full, ["m"])
write("python_list_of_lists_3d", repr([m.tolist() for m in many]), many)
write("python_list_of_arrays", repr([np.round(m, 3) for m in many]), np.round(many, 3))
write("python_rows_one_by_one", "\n".join(repr(r) for r in full.tolist()), full)
write("python_prompt", ">>> M\n" + repr(np.round(full, 6)), np.round(full, 6))
write("notebook_output", "Out[12]:\n" + repr(np.round(full, 6)), np.round(full, 6))
write("notebook_output_same_line", "Out[12]: " + repr(np.round(full, 6)), np.round(full, 6))
write("numpy_scalars", repr([[np.float64(x) for x in row] for row in full]), full)
short = np.round(full, 8)
write("numpy_repr", repr(short), short)
write("numpy_print", str(short), short)
write("numpy_print_identity", str(np.eye(4)), np.eye(4))
write("numpy_repr_int", repr(np.eye(4, dtype=int)), np.eye(4), decimals=None)
single = np.round(full, 3).astype(np.float32)
write("numpy_repr_float32", repr(single), [float(str(x)) for x in single.ravel()])
with np.printoptions(precision=17):
    small = full.copy()
    small[3, 2] = 1.2345678901234567e-9
    write("numpy_print_wrapped", str(small), [float(t) for t in str(small).replace("[", " ").replace("]", " ").split()])
    write("numpy_repr_wrapped", repr(small), [float(t) for t in str(small).replace("[", " ").replace("]", " ").split()])
write("numpy_print_3d", str(np.round(many, 5)), np.round(many, 5))
write("numpy_repr_3d", repr(np.round(many, 5)), np.round(many, 5))
write("numpy_print_flat", str(np.round(full.ravel(), 5)), np.round(full, 5))
write("numpy_print_flat_many", str(np.round(np.ravel(many[:2]), 3)), np.round(many[:2], 3))
write("numpy_print_rows_of_sixteen", str(np.round(np.reshape(many, (5, 16)), 5)), np.round(many, 5))
write("numpy_savetxt", "\n".join(" ".join("%.18e" % x for x in row) for row in full) + "\n",
      [float("%.18e" % x) for x in full.ravel()])

# Rows with semicolons, as MATLAB and Octave write and print them.
semicolons = lambda cells, between: "; ".join(rows(cells, between))
write("matlab_spaces", f"M = [{semicolons(texts, ' ')}];\n", said, ["M"])
write("matlab_commas", f"M = [{semicolons(texts, ', ')}];", said, ["M"])
write("matlab_tight", "M=[" + ";".join(rows(texts, ",")) + "]", said, ["M"])
write("matlab_lines", "M = [\n" + "\n".join("  " + r for r in rows(texts, "  ")) + "\n];\n", said, ["M"])
write("matlab_lines_hanging", "M = [" + "\n     ".join(rows(texts, " ")) + "];\n", said, ["M"])
write("matlab_lines_semicolons", "M = [\n" + ";\n".join(rows(texts, ", ")) + ";\n];\n", said, ["M"])
write("matlab_comments", "M = [ % film\n" + "".join(r + "; % row\n" for r in rows(texts, " ")) + "];", said, ["film"])
write("matlab_continued", "M = [" + "; ".join(" ".join(row[:2]) + " ...\n  " + " ".join(row[2:]) for row in texts) + "];", said, ["M"])
write("matlab_several", "".join(f"M{k} = [{semicolons(printed(m)[0], ' ')}];\n" for k, m in enumerate(many)), many_said, [f"M{k}" for k in range(5)])
write("matlab_display", "\nM =\n\n" + "".join("  " + "".join("%10.4f" % x for x in row) + "\n" for row in one) + "\n", said, ["M"])
write("matlab_no_brackets", ";".join(rows(texts, ",")), said)
write("matlab_no_brackets_spaces", "; ".join(rows(texts, " ")), said)
write("matlab_flat", "[" + " ".join(flat) + "]", said)
write("braces", "{{" + "},{".join(rows(texts, ",")) + "}}", said)
write("c_array", "const double m[4][4] = {\n  {" + "},\n  {".join(rows(texts, ", ")) + "}\n};\n", said)

# JSON.
write("json_nested", json.dumps(full.tolist()), full)
write("json_flat", json.dumps(full.ravel().tolist()), full)
write("json_indented", json.dumps(full.tolist(), indent=2), full)
write("json_several", json.dumps([m.tolist() for m in many], indent=1), many)
write("json_rows_of_sixteen", json.dumps([m.ravel().tolist() for m in many]), many)

# Extremes, exactly.
odd = [5e-324, -5e-324, 2.2250738585072014e-308, 1.7976931348623157e308, 0.1, 0.1 + 0.2, 1 / 3,
       2.0**-1074, 9007199254740993.0, 1e23, -0.0, 4.35, 0.000001, 123456789012345680.0, 1e-7, 1.0]
write("extremes", " ".join(repr(x) for x in odd), odd)
digits = ["0.1000000000000000055511151231257827021181583404541015625", "1.00000000000000011102230246251565404",
          "2.4703282292062327208e-324", "6.00000E+00", "+.5", "5.", "-0.", "007"] + ["1E-2"] * 8
write("long_digits", "\t".join(digits), [float(t) for t in digits])

# Typeset.
bs = "\\"
body = lambda cells: (bs * 2 + "\n").join(rows(cells, " & "))
environment = lambda name, cells, columns="": f"{bs}begin{{{name}}}{columns}\n{body(cells)}\n{bs}end{{{name}}}"
write("tex_pmatrix", environment("pmatrix", texts), said, decimals=4)
write("tex_one_line", f"$M = {bs}begin{{bmatrix}}" + (bs * 2).join(rows(texts, "&")) + f"{bs}end{{bmatrix}}$", said, ["M"])
write("tex_array", f"{bs}[\n{bs}mathbf{{M}} = {bs}left[" + environment("array", texts, "{rrrr}") + f"{bs}right]\n{bs}]\n", said, ["M"])
write("tex_rows", (bs * 2 + "\n").join(rows(texts, " & ")) + bs * 2 + "[2pt]\n", said)
write("tex_phantom", environment("pmatrix", [[t if t.startswith("-") else f"{bs}phantom{{-}}{t}" for t in row] for row in texts]), said)
write("tex_decimal_comma", environment("pmatrix", [[t.replace(".", "{,}") for t in row] for row in texts]), said)
write("tex_several", "\n\n".join(environment("pmatrix", printed(m)[0]) for m in many), many_said)
powers = printed(one / 100, "%.3e")
raised = lambda times: [[f"{t.split('e')[0]}{times}10^{{{int(t.split('e')[1])}}}" for t in row] for row in powers[0]]
write("tex_times", environment("pmatrix", raised(f" {bs}times ")), powers[1])
write("tex_cdot", environment("pmatrix", raised(f"{bs}cdot")), powers[1])
write("tex_num", environment("pmatrix", [[f"{bs}num{{{t}}}" for t in row] for row in texts]), said)
write("tex_tabular", environment("tabular", texts, "{cccc}").replace("\n", f"\n{bs}hline\n", 1), said)

# Powers of ten in other notations.
write("fortran_d", "\n".join(rows([[t.replace("e", "D") for t in row] for row in powers[0]], " ")), powers[1])
superscript = str.maketrans("-0123456789", "\u207b\u2070\u00b9\u00b2\u00b3\u2074\u2075\u2076\u2077\u2078\u2079")
write("power_superscript", "\n".join(rows([[f"{t.split('e')[0]}\u00b710{str(int(t.split('e')[1])).translate(superscript)}" for t in row] for row in powers[0]], "\t")), powers[1])
write("power_cross", "\n".join(rows([[f"{t.split('e')[0]} \u00d7 10^{int(t.split('e')[1])}" for t in row] for row in powers[0]], "\t")), powers[1])
write("power_letter_x", "\n".join(rows([[f"{t.split('e')[0]} x 10^{int(t.split('e')[1])}" for t in row] for row in powers[0]], "  ")), powers[1])
write("power_decimal_comma", "\n".join(rows([[t.replace(".", ",") for t in row] for row in powers[0]], "  ")), powers[1])
write("power_stars", "\n".join(rows([[f"{t.split('e')[0]}*10**{int(t.split('e')[1])}" for t in row] for row in powers[0]], ", ")), powers[1])

# Console prints in blocks of columns and with a common factor.
wide = [["%10.4f" % x for x in row] for row in one]
block = lambda first, last: "\n".join("".join(row[first - 1:last]) for row in wide)
write("columns_three_and_one", f"\nM =\n\n  Columns 1 through 3\n\n{block(1, 3)}\n\n  Column 4\n\n{block(4, 4)}\n\n", said, ["M"])
write("columns_with_colons", f"M =\n\n Columns 1 through 2:\n\n{block(1, 2)}\n\n Columns 3 and 4:\n\n{block(3, 4)}\n\n", said, ["M"])
line = ["%10.4f" % x for x in np.ravel(one)]
write("columns_of_sixteen", "ans =\n\n  Columns 1 through 7\n\n" + "".join(line[:7]) + "\n\n  Columns 8 through 14\n\n" + "".join(line[7:14]) + "\n\n  Columns 15 through 16\n\n" + "".join(line[14:]) + "\n", said)
scaled = [float(t + "e-03") for t in np.ravel(texts)]
write("common_factor", "\nM =\n\n   1.0e-03 *\n\n" + "\n".join("".join(row) for row in wide) + "\n\n", scaled, ["M"], decimals=7)
write("common_factor_and_columns", f"\nM =\n\n   1.0e-03  *\n\n  Columns 1 through 3\n\n{block(1, 3)}\n\n  Column 4\n\n{block(4, 4)}\n\nN =\n\n" + "\n".join("".join(row) for row in wide) + "\n", scaled + said, ["M", "N"])

# Uncertainties.
sigmas = RNG.integers(2, 90, (4, 4))
sigma_said = [float(f"{s}e-4") for s in sigmas.ravel()]
concise = [[f"{t}({s})" for t, s in zip(row, line)] for row, line in zip(texts, sigmas)]
write("uncertainty_concise", "\n".join(rows(concise, "\t")), said, sigma=[sigma_said])
write("uncertainty_concise_list", "[" + ", ".join("[" + ", ".join(row) + "]" for row in concise) + "]", said, sigma=[sigma_said])
plus_minus = lambda sign: [[f"{t}{sign}{'%.4f' % (s / 1e4)}" for t, s in zip(row, line)] for row, line in zip(texts, sigmas)]
write("uncertainty_plus_minus", "\n".join(rows(plus_minus(" \u00b1 "), "\t")), said, sigma=[sigma_said])
write("uncertainty_plus_minus_spaces", "\n".join(rows(plus_minus("\u00b1"), "   ")), said, sigma=[sigma_said])
write("uncertainty_ascii", "\n".join(rows(plus_minus(" +/- "), ", ")), said, sigma=[sigma_said])
write("uncertainty_tex", environment("pmatrix", plus_minus(f" {bs}pm ")), said, sigma=[sigma_said])
exact = [["1"] + concise[0][1:]] + concise[1:]
write("uncertainty_exact_first", "\n".join(rows(exact, "\t")), said, sigma=[[0.0] + sigma_said[1:]])
write("uncertainty_decimal_comma", "\n".join(rows([[t.replace(".", ",") for t in row] for row in concise], "\t")), said, sigma=[sigma_said])
write("uncertainty_second_array", f"M = np.array({one.tolist()})\nM_sigma = np.array({np.reshape(sigma_said, (4, 4)).tolist()})\n", one, ["M"], sigma=[sigma_said])

# Objects.
write("object", json.dumps({"sample": "kelp", "mueller": one.tolist(), "temperature": 21.5}), one, [None])
write("object_indented", json.dumps({"film A": one.tolist(), "film B": many[0].tolist()}, indent=2), [one, many[0]], ["film A", "film B"])
write("object_list", json.dumps({"schema": 1, "notes": ["{made} [up], # 1"], "matrices": [
    {"name": n, "unit": None, "mueller": m.tolist(), "sigma": np.reshape(sigma_said, (4, 4)).tolist()} for n, m in zip(names, many)],
    "tables": [{"name": "t", "columns": [{"name": "x", "values": list(range(16))}]}]}), many, names, sigma=[sigma_said] * 5)
write("object_rows", json.dumps([{"wavelength": 450 + k, "m": m.ravel().tolist()} for k, m in enumerate(many)]), many, ["m"] * 5)
write("object_single_quotes", repr({"mueller": one.tolist(), "ok": True}), one)

# A coordinate before the sixteen, units, remarks.
places = [450.0, 475.5, 500.0, 550.0, 633.0]
write("coordinates", "\n".join("\t".join([f"{x:g}", r]) for x, r in zip(places, many_flat)), many_said, coordinates=places)
write("coordinates_header", "wavelength/nm," + ",".join(f"m{k}" for k in range(16)) + "\r\n" + "\r\n".join(f"{x:g}," + r.replace("\t", ",") for x, r in zip(places, many_flat)), many_said, coordinates=places)
write("coordinates_decimal_comma", "\n".join(";".join([f"{x:g}", r.replace("\t", ";")]).replace(".", ",") for x, r in zip(places, many_flat)), many_said, coordinates=places)
write("coordinate_titles", "\n".join(f"{x:g} nm\n" + "\n".join(rows(printed(m)[0], " ")) for x, m in zip(places, many)), many_said, coordinates=places)
write("unit_row", "a\tb\tc\td\n(V)\t(V)\t(V)\t(V)\n" + "\n".join(rows(texts, "\t")), said, [None])
write("units_behind", "\n".join(r + " V" for r in rows(texts, " ")), said)
write("per_cent", "\n".join(rows([["%.2f%%" % (100 * x) for x in row] for row in one], "  ")), [float("%.2f" % (100 * x)) for x in one.ravel()])
write("per_cent_gaps", "\n".join(rows([["%.2f %%" % (100 * x) for x in row] for row in one], "\t")), [float("%.2f" % (100 * x)) for x in one.ravel()])
counts = np.round(one * 45000).astype(int)
write("grouped_by_spaces", "\n".join(rows([[f"{x:,}".replace(",", "\u202f") for x in row] for row in counts], "\t")), counts)

# Files: arrays as NumPy saves them, tables as spreadsheets save them.
def save(name, array, matrices):
    np.save(HERE / "files" / name, array)
    files[f"{name}.npy"] = np.asarray(matrices, dtype=float).reshape(-1, 16).tolist()


files = {}
(HERE / "files").mkdir(exist_ok=True)
stack = np.array(many)
save("one", full, full)
save("sixteen", full.ravel(), full)
save("stack", stack, stack)
save("stack_last", np.moveaxis(stack, 0, -1).copy(), stack)
save("fortran", np.asfortranarray(stack), stack)
save("rows", stack.reshape(5, 16), stack)
save("rows_last", stack.reshape(5, 16).T.copy(), stack)
save("map", np.array([many[:3], many[2:]]), [many[:3], many[2:]])
save("big_endian", stack.astype(">f8"), stack)
save("single", stack.astype("<f4"), stack.astype("<f4"))
save("half", stack.astype("<f2"), stack.astype("<f2"))
save("signed", (stack * 100).astype("<i4"), (stack * 100).astype("<i4"))
save("bytes", np.abs(stack * 100).astype("|u1"), np.abs(stack * 100).astype("|u1"))
for name, encoding in [("utf16le.txt", "utf-16-le"), ("utf16be.txt", "utf-16-be"), ("utf8.csv", "utf-8-sig"), ("cp1252.csv", "cp1252")]:
    bom = "\ufeff" if encoding.startswith("utf-16") else ""
    text = bom + "\u00b5-Film \u2013 A\r\n" + "\r\n".join(rows(comma, "\t" if bom else ";")) + "\r\n"
    (HERE / "files" / name).write_bytes(text.encode(encoding))
    files[name] = [said]
(HERE / "files" / "expected.json").write_text(json.dumps(files) + "\n")

(HERE / "expected.json").write_text(json.dumps(expected, indent=0) + "\n")
print(len(expected), "samples")
