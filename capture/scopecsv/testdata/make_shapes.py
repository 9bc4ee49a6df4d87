#!/usr/bin/env python3
"""Writes shapes/ (one small table per shape) and shapes.json (what is true of
each), from Python's own number parsing. Standard library only:

    python3 make_shapes.py

The signals are ours, the layouts are generic: no maker's file is copied.
Each truth holds either an error (line, a piece of its text) or rate, start,
frames, per channel name, count, min, max, mean, rms over the samples present,
and the flag codes. Values are computed from the printed text, so reading must
be exact.
"""
import json, math, os, random

here = os.path.dirname(os.path.abspath(__file__))
out = os.path.join(here, "shapes")
os.makedirs(out, exist_ok=True)
for old in os.listdir(out):
    os.remove(os.path.join(out, old))
truth = {}
rnd = random.Random(7)


def sine(n, amp=1.0, per=25.0, ph=0.3, off=0.0, noise=0.01):
    return [off + amp * math.sin(2 * math.pi * i / per + ph) + noise * rnd.gauss(0, 1) for i in range(n)]


def f(v, d):
    return ["%.*f" % (d, x) for x in v]


def e(v, d):
    return ["%.*E" % (d, x) for x in v]


def nums(cells, factor=1.0):
    """values of printed cells; None where there is none"""
    r = []
    for c in cells:
        try:
            r.append(float(c) / round(1 / factor) if factor < 1 else float(c) * factor)
        except ValueError:
            r.append(None)
    return r


def chan(name, cells, factor=1.0, unit="V"):
    v = [x for x in nums(cells, factor) if x is not None and math.isfinite(x)]
    return {"name": name, "unit": unit, "count": len(v), "min": min(v), "max": max(v),
            "mean": math.fsum(v) / len(v), "rms": math.sqrt(math.fsum(x * x for x in v) / len(v))}


def put(name, text, **t):
    b = text if isinstance(text, bytes) else text.encode()
    with open(os.path.join(out, name + ".csv"), "wb") as h:
        h.write(b)
    assert name not in truth, name
    truth[name] = t


def ok(name, text, rate, chans, start=0.0, frames=None, flags=(), **more):
    put(name, text, rate=rate, start=start, frames=frames, channels=chans, flags=sorted(flags), **more)


def bad(name, text, line, says, cls="ambiguous", **more):
    put(name, text, error={"line": line, "says": says, "class": cls}, **more)


def rows(*cols, sep=",", end="\n", tail=""):
    return "".join(sep.join(r) + tail + end for r in zip(*cols))


N = 60
t6 = f([i * 1e-4 for i in range(N)], 6)
a = f(sine(N), 4)
b = f(sine(N, 0.3, 12.5, 1.1, 0.5), 4)
A, B = chan("CH1", a), chan("CH2", b)


def nm(c, name):
    return dict(c, name=name)


# --- where the data sits -------------------------------------------------
ok("bare-two-columns", rows(t6, a), 1e4, [nm(A, "")], frames=N)
ok("bare-two-columns-crlf", rows(t6, a, end="\r\n"), 1e4, [nm(A, "")], frames=N)
ok("bare-two-columns-cr", rows(t6, a, end="\r"), 1e4, [nm(A, "")], frames=N)
ok("bare-two-columns-crcrlf", rows(t6, a, end="\r\r\n"), 1e4, [nm(A, "")], frames=N)
ok("no-last-line-end", rows(t6, a)[:-1], 1e4, [nm(A, "")], frames=N)
ok("blank-last-rows", rows(t6, a) + "\n\n", 1e4, [nm(A, "")], frames=N)
ok("bare-values", rows(a), None, [nm(A, "")], frames=N, flags=["rate-doubt"])
ok("bare-three-columns", rows(t6, a, b), 1e4, [nm(A, ""), nm(B, "")], frames=N)
ok("header-row", "Time,CH1,CH2\n" + rows(t6, a, b), 1e4, [A, B], frames=N)
ok("header-units-in-brackets", "Time (s),CH1 (V),CH2 [mV]\n" + rows(t6, a, b), 1e4, [A, chan("CH2", b, 1e-3)], frames=N)
ok("header-units-row", "Time,CH1,CH2\ns,V,V\n" + rows(t6, a, b), 1e4, [A, B], frames=N)
ok("header-units-row-blank-row", "Time,Channel A,Channel B\n(ms),(mV),(V)\n\n" + rows(t6, a, b), 1e7,
   [chan("Channel A", a, 1e-3), nm(B, "Channel B")], frames=N)
ok("units-glued", "time_s,voltage_CH1_V,voltage_CH2_mV\n" + rows(t6, a, b), 1e4,
   [nm(A, "voltage_CH1_V"), chan("voltage_CH2_mV", b, 1e-3)], frames=N)
ok("units-with-slash", "t/ms;U1/V;U2/mV\n" + rows(t6, a, b, sep=";"), 1e7, [nm(A, "U1/V"), chan("U2/mV", b, 1e-3)], frames=N)
ok("units-with-in", "Time in us,CH1 in V\n" + rows(t6, a), 1e10, [nm(A, "CH1 in V")], frames=N)
ok("unit-words", "second,Volt\n" + rows(t6, a), 1e4, [nm(A, "Volt")], frames=N)
ok("source-and-unit-words", "x-axis,1,2\nsecond,Volt,Volt\n" + rows(t6, a, b), 1e4, [nm(A, "1"), nm(B, "2")], frames=N)
kv = ["Model,Bench 4", "Record Length,%d" % N, "Sample Interval,1.0E-4", "Vertical Units,V", "Probe Attenuation,10",
      "Horizontal Units,s", "Note,after soldering"]
ok("settings-comma", "\n".join(kv) + "\nTIME,CH1\n" + rows(t6, a), 1e4, [A], frames=N)
ok("settings-colon", "\n".join(x.replace(",", ": ") for x in kv) + "\n\nTIME,CH1\n" + rows(t6, a), 1e4, [A], frames=N)
ok("settings-equals", "\n".join(x.replace(",", " = ") for x in kv) + "\nTIME,CH1\n" + rows(t6, a), 1e4, [A], frames=N)
ok("settings-tab", "\n".join(x.replace(",", "\t") for x in kv) + "\nTIME\tCH1\n" + rows(t6, a, sep="\t"), 1e4, [A], frames=N)
ok("settings-quoted", "\n".join('"%s","%s"' % tuple(x.split(",")) for x in kv) + '\n"TIME","CH1"\n' + rows(t6, a), 1e4, [A], frames=N)
ok("settings-padded", "\n".join("%-20s, %s  " % tuple(x.split(",")) for x in kv) + "\nTIME  , CH1\n" + rows(t6, a, sep=" , "), 1e4, [A], frames=N)
ok("settings-marker-header", "\n".join(kv) + "\ndata\nTIME,CH1\n" + rows(t6, a), 1e4, [A], frames=N)
ok("settings-no-header", "\n".join(kv) + "\n" + rows(t6, a), 1e4, [nm(A, "")], frames=N)
ok("settings-rate-si", "Sample Rate: 10 kSa/s\nChannel 1\n" + rows(a), 1e4, [nm(A, "Channel 1")], frames=N)
ok("settings-rate-mhz", "Sampling rate [MHz];0.01\nU (mV)\n" + rows(a), 1e4, [chan("U", a, 1e-3)], frames=N)
ok("settings-period-word", "Sampling Period:100us\nVolts\n" + rows(a), 1e4, [nm(A, "Volts")], frames=N)
ok("hash-comments", "# bench take\n# rate 10 kHz\n# time (s), CH1 (V)\n" + rows(t6, a), 1e4, [A], frames=N)
ok("percent-comments", "% bench take\n% t [s]\tCH1 [V]\n" + rows(t6, a, sep="\t"), 1e4, [A], frames=N)
blk = "Header\tv2\nSeparator\tTab\n***End_of_header***\n\nChannels\t2\nSamples\t%d\t%d\nX0\t0.0\t0.0\nDelta_X\t1.0E-4\t1.0E-4\nY_Unit_Label\tVolts\tVolts\n***End_of_header***\n" % (N, N)
ok("two-headers-end-markers", blk + "X_Value\tCH1\tCH2\tComment\n" + rows(t6, a, b, sep="\t"), 1e4, [A, B], frames=N)
ok("two-headers-no-x", blk + "X_Value\tCH1\tCH2\tComment\n" + "".join("\t%s\t%s\n" % r for r in zip(a, b)), 1e4, [A, B], frames=N)

side = [("Record Length", "%d" % N, ""), ("Sample Interval", "1.000000E-04", ""), ("Trigger Point", "3.0E+01", ""), ("Source", "CH1", ""),
        ("Vertical Units", "V", ""), ("Vertical Scale", "5.0E-01", ""), ("Vertical Offset", "0.0", ""), ("Horizontal Units", "s", ""),
        ("Horizontal Scale", "2.5E-3", ""), ("Pt Fmt", "Y", ""), ("Yzero", "0.0", ""), ("Probe Atten", "1.0", ""), ("Model Number", "B4", ""),
        ("Serial Number", "0017", ""), ("Firmware Version", "v1", "")]
tn = f([i * 1e-4 - 0.003 for i in range(N)], 6)


def beside(i, s):
    return "%s,%s,%s" % s[i] if i < len(s) else ",,"


ok("settings-beside", "".join("%s,%s,%s,\n" % (beside(i, side), tn[i], a[i]) for i in range(N)), 1e4, [nm(A, "")], start=-0.003, frames=N)
ok("settings-beside-short", "".join("%s,%s,%s,\n" % (beside(i, side), tn[i], a[i]) for i in range(12)), 1e4,
   [chan("", a[:12])], start=-0.003, frames=12, flags=["truncated"])
ok("settings-beside-twice", "".join("%s,%s,%s,%s,%s,%s\n" % (beside(i, side), tn[i], a[i], beside(i, side), tn[i], b[i]) for i in range(N)),
   1e4, [nm(A, ""), nm(B, "")], start=-0.003, frames=N)
ok("footer", rows(t6, a) + "\r\nRecord Length,%d\r\nSample Interval,1E-4\r\nModel,B4\r\n" % N, 1e4, [nm(A, "")], frames=N)
ok("header-repeated", "Time,CH1\n" + rows(t6[:30], a[:30]) + "Time,CH1\n" + rows(t6[30:], a[30:]), 1e4, [A], frames=N, flags=["gap"])
ok("segments-start-times", "Time (s),CH1 (V)\n" + "".join("Start: 12:00:%02d\n" % s + rows(t6[:20], a[20 * s:20 * s + 20]) for s in range(3)),
   1e4, [A], frames=N, flags=["gap"])
ok("leading-empty-field", "".join(",%s,%s\n" % r for r in zip(t6, a)), 1e4, [nm(A, "")], frames=N)
ok("leading-empty-field-header", "Time,CH1\n" + "".join(",%s,%s\n" % r for r in zip(t6, a)), 1e4, [A], frames=N)
ok("trailing-empty-fields", "Time,CH1,,\n" + rows(t6, a, tail=",,"), 1e4, [A], frames=N)
ok("trailing-separator-blank", "Time,CH1\n" + rows(t6, a, tail=", "), 1e4, [A], frames=N)
ok("lone-separators", "Time,CH1\n,\n" + rows(t6, a) + ",\n,\n,\n", 1e4, [A], frames=N)
ok("extra-text-columns", "Time,CH1,Event,Comment\n" + "".join("%s,%s,%s,\n" % (t6[i], a[i], "start" if i == 7 else "") for i in range(N)), 1e4, [A], frames=N)
ok("alarm-and-date", "Date,Time,CH1,Alarm\n" + "".join("2026-12-01,12:00:%06.3f,%s,Normal\n" % (i * 0.1, a[i]) for i in range(N)), 10, [A], frames=N)
ok("peak-detect-columns", "Time,CH1 min,CH1 max\n" + rows(t6, a, b), 1e4, [nm(A, "CH1 min"), nm(B, "CH1 max")], frames=N, flags=["peak-detect"])
ok("index-start-increment", "X,CH1,CH2,Start,Increment\nSequence,Volt,Volt,-3.000000e-03,1.000000e-04\n" + "".join("%d,%s,%s,\n" % (i, a[i], b[i]) for i in range(N)),
   1e4, [A, B], start=-0.003, frames=N)
ok("index-increment-missing", "X,CH1,Start,Increment\nSequence,Volt,,\n" + "".join("%d,%s,,\n" % (i, a[i]) for i in range(N)), None, [A], frames=N, flags=["rate-doubt"])
ok("index-increment-first-row", "X,CH1,Start,Increment\n" + "".join("%d,%s,%s\n" % (i, a[i], "-0.003,0.0001" if i == 0 else ",") for i in range(N)),
   1e4, [A], start=-0.003, frames=N)
ok("index-column-named", "No.,Time (s),CH1 (V)\n" + "".join("%d,%s,%s\n" % (i + 1, t6[i], a[i]) for i in range(N)), 1e4, [A], frames=N)
ok("index-column-unnamed", ",Time (s),CH1 (V)\n" + "".join("%d,%s,%s\n" % (i, t6[i], a[i]) for i in range(N)), 1e4, [A], frames=N)

# --- separators and numbers ----------------------------------------------
dc = lambda c: [x.replace(".", ",") for x in c]
ok("semicolon-decimal-comma", "Time;CH1\ns;V\n" + rows(dc(t6), dc(a), sep=";"), 1e4, [A], frames=N)
ok("semicolon-decimal-point", "Time;CH1\n" + rows(t6, a, sep=";"), 1e4, [A], frames=N)
ok("tab-decimal-comma", "Time\tCH1\n" + rows(dc(t6), dc(a), sep="\t"), 1e4, [A], frames=N)
ok("quoted-decimal-comma", '"Time","CH1"\n' + "".join('"%s","%s"\n' % r for r in zip(dc(t6), dc(a))), 1e4, [A], frames=N)
ok("one-blank", "Time CH1\n" + rows(t6, a, sep=" "), 1e4, [A], frames=N)
ok("aligned-blanks", "  Time (s)    CH1 (V)\n" + "".join("%12s %10s\n" % r for r in zip(t6, a)), 1e4, [A], frames=N)
ok("two-blanks-no-header", rows(t6, a, b, sep="  "), 1e4, [nm(A, ""), nm(B, "")], frames=N)
z = ["%s%08.4f" % ("-" if x < 0 else "", abs(x)) for x in sine(N)]
ok("leading-zeros", "Time,CH1\n" + rows(t6, z), 1e4, [chan("CH1", z)], frames=N)
x3 = ["%+.1fE%+04d" % (x * 1e3, -3) for x in sine(N)]
ok("plus-three-digit-exponents", "Time,CH1\n" + rows(e([i * 1e-4 for i in range(N)], 5), x3), 1e4, [chan("CH1", x3)], frames=N)
xv = ["%.4E" % x if i % 3 else "%.4fE0" % x for i, x in enumerate(sine(N))]
ok("changing-exponents", "Time,CH1\n" + rows(t6, xv), 1e4, [chan("CH1", xv)], frames=N)
long = ["%.20f" % x for x in sine(N)]
ok("twenty-digits", "Time,CH1\n" + rows(["%.17g" % (i * 1e-4) for i in range(N)], long), 1e4, [chan("CH1", long)], frames=N)
big = ["{:,.2f}".format(1500 * x) for x in sine(N)]
ok("grouped-quoted", "Time,CH1 (mV)\n" + "".join('%s,"%s"\n' % r for r in zip(t6, big)), 1e4, [chan("CH1", [x.replace(",", "") for x in big], 1e-3)], frames=N)
suf = ["%.1fmV" % (x * 1e3) for x in sine(N)]
ts = ["%dus" % (i * 100 - 3000) for i in range(N)]
ok("glued-suffixes", "Time,CH1\n" + rows(ts, suf), 1e4, [chan("CH1", [x[:-2] for x in suf], 1e-3)], start=-0.003, frames=N)
mix = ["%.4fV" % x if abs(x) >= 0.1 else "%.1fmV" % (x * 1e3) for x in sine(N)]
ok("glued-changing-prefix", "Time,CH1\n" + rows(t6, mix), 1e4,
   [chan("CH1", [x[:-1] if not x.endswith("mV") else "%.6f" % (float(x[:-2]) / 1e3) for x in mix])], frames=N)
ok("unicode-minus", "Time,CH1\n" + rows(t6, [x.replace("-", "\u2212") for x in a]), 1e4, [A], frames=N)
ok("names-other-languages", "\u65f6\u95f4(s),\u901a\u9053 1 (V)\n" + rows(t6, a), 1e4, [nm(A, "\u901a\u9053 1")], frames=N)
ok("latin1-micro", b"Zeit (\xb5s);Spannung (\xb5V)\n" + rows(t6, a, sep=";").encode(), 1e10, [chan("Spannung", a, 1e-6)], frames=N)
ok("utf8-bom", "\ufeffTime,CH1\n" + rows(t6, a), 1e4, [A], frames=N)
ok("utf16le-bom", ("\ufeffTime (\u00b5s)\tCH1\n" + rows(t6, a, sep="\t")).encode("utf-16-le"), 1e10, [A], frames=N)
ok("utf16be-no-bom", ("Time,CH1\n" + rows(t6, a)).encode("utf-16-be"), 1e4, [A], frames=N)
ok("nul-before-rows", b"Time,CH1\n" + b"\0" * 64 + rows(t6, a).encode(), 1e4, [A], frames=N)
ok("quoted-header-line-break", '"Time\n(s)","CH1\n(mV)"\n' + rows(t6, a), 1e4, [chan("CH1", a, 1e-3)], frames=N)
ok("bars", "Time|CH1\n" + rows(t6, a, sep="|"), 1e4, [A], frames=N)


def holes(cells, at):
    c = list(cells)
    for i, w in at.items():
        c[i] = w
    return c


def lossy(name, at, text=None, flags=("overrange",)):
    c = holes(a, at)
    ok(name, "Time,CH1,CH2\n" + rows(t6, c, b), 1e4,
       [chan("CH1", [x if i not in at else "" for i, x in enumerate(c)]), B], frames=N, flags=flags, missing=sorted(at))


lossy("nan-cells", {5: "NaN", 6: "nan", 20: "-nan"})
lossy("infinite-cells", {5: "INF", 6: "-inf", 30: "\u221e"})
lossy("spreadsheet-marks", {5: "####", 6: "#NAME?", 7: "--", 8: ""})
lossy("overrange-figure", {0: "9.9E37", 1: "-9.9E+37", 2: "9.91e37"})
lossy("overrange-words", {11: "OVLD", 12: "OL", 13: ">5.0"})
lossy("leading-blank-samples", {i: "" for i in range(9)})
lossy("word-in-a-cell", {17: "ouch"})
ok("trace-ends-early", "Time,CH1,MATH\n" + "".join("%s,%s,%s\n" % (t6[i], a[i], b[i] if i < 40 else "") for i in range(N)), 1e4,
   [A, chan("MATH", b[:40])], frames=N, flags=["overrange"])
ok("trace-ends-early-trimmed", "Time,CH1,MATH\n" + "".join("%s,%s%s\n" % (t6[i], a[i], "," + b[i] if i < 40 else "") for i in range(N)), 1e4,
   [A, chan("MATH", b[:40])], frames=N, flags=["overrange"])

# --- time ------------------------------------------------------------------
M = 400
m = f(sine(M), 4)
CM = chan("CH1", m)
r5 = ["%.5g" % (0.02 + i * 1.6e-6) for i in range(M)]
ok("rounded-column-stated-interval", "Sample Interval,1.6e-06\nTime,CH1\n" + rows(r5, m), 625000, [CM], start=0.02, frames=M)
ok("rounded-column-alone", "Time,CH1\n" + rows(["%.6f" % (i * 1.6e-6) for i in range(M)], m), 625000, [CM], frames=M)
ok("rounded-stated-rate", "Sample Rate,1.5873e+06\nTime,CH1\n" + rows(["%.3e" % (i * 0.63e-6) if i < 1 else "%.8f" % (i * 0.63e-6) for i in range(M)], m),
   1 / 0.63e-6, [CM], frames=M)
ok("float32-stamps", "Time,CH1\n" + rows(["%.12f" % __import__("struct").unpack("f", __import__("struct").pack("f", 1 + i * 1e-5))[0] for i in range(M)], m),
   1e5, [CM], start=1.0, frames=M, tol=1e-6)
gapt = [i * 1e-4 + (3.0 if i >= 150 else 0) for i in range(M)]
ok("gap-of-seconds", "Time,CH1\n" + rows(f(gapt, 4), m), 1e4, [CM], frames=M, flags=["gap"], joints=[150])
ok("stated-one-rows-other", "Sample Interval,1.0\nTime,CH1\n" + rows(f([i * 0.59 for i in range(M)], 2), m), 1 / 0.59, [CM], frames=M, flags=["rate-doubt"])
ok("stated-one-digit-rows-other", "Sample Interval,1\nTime,CH1\n" + rows(f([i * 0.59 for i in range(M)], 2), m), 1 / 0.59, [CM], frames=M, flags=["rate-doubt"])
bad("header-s-values-ms", "Sample Rate,10000\nTime (s),CH1 (V)\n" + rows(f([i * 0.1 for i in range(M)], 1), m), 2, "wrong unit")
pairs = ["%.6f" % ((i // 2) * 1e-3) for i in range(M)]
ok("stamps-twice", "Time,CH1\n" + rows(pairs, m), None, [CM], frames=M, flags=["duplicate-time", "rate-doubt"])
ok("stamps-whole-seconds", "Time,CH1\n" + rows(["%d" % (i // 10) for i in range(M)], m), 10, [CM], frames=M, flags=["duplicate-time"], tol=3e-3)
ok("negative-start", "Time,CH1\n" + rows(tn, a), 1e4, [A], start=-0.003, frames=N)
ok("descending", "Time,CH1\n" + rows(t6[::-1], a[::-1]), 1e4, [A], frames=N, flags=["time-jitter"])
ok("frequency-named-ms", "frequency,CH1\nms,V\n" + rows(f([i * 0.1 for i in range(N)], 1), a), 1e4, [nm(A, "CH1")], frames=N)
bad("frequency-log", "Frequency (Hz),Gain (dB)\n" + rows(f([10 * 1.2 ** i for i in range(40)], 3), a[:40]), 1, "frequency", "unsupported")
bad("frequency-linear", "freq,level\n" + rows(f([10 * i for i in range(40)], 1), a[:40]), 1, "frequency", "unsupported")
auto = ["%.6g" % (v if abs(v) >= 1 else v * 1e3) for v in [5 - i * 0.0135 for i in range(M)]]
ok("auto-ranged-suffix-lost", "Time,CH1\n" + rows(auto, m), None, [CM], loose=True, frames=M, flags=["rate-doubt", "time-jitter"])
ok("clock-ms", "Time,CH1\n" + rows(["12:34:%06.3f" % (i * 0.025) for i in range(M)], m), 40, [CM], frames=M)
ok("clock-comma-ms", "Time;CH1\n" + rows([("12:34:%06.3f" % (i * 0.025)).replace(".", ",") for i in range(M)], dc(m), sep=";"), 40, [CM], frames=M)
ok("date-time", "Date Time,CH1\n" + rows(["2026-12-01 23:59:%06.3f" % (50 + i * 0.025) for i in range(M)], m), 40, [CM], frames=M)


def over(i, step=0.025):
    s = 86400 - 5 + i * step
    d = int(s // 86400)
    s -= 86400 * d
    return d, "%02d:%02d:%06.3f" % (s // 3600, s % 3600 // 60, s % 60)


ok("midnight-date-month-first", "Date,Time,CH1\n" + "".join("%s,%s,%s\n" % (["01/12/2026", "01/13/2026"][over(i)[0]], over(i)[1], m[i]) for i in range(M)), 40, [CM], frames=M)
ok("midnight-date-day-first", "Date,Time,CH1\n" + "".join("%s,%s,%s\n" % (["11/12/2026", "12/12/2026"][over(i)[0]], over(i)[1], m[i]) for i in range(M)), 40, [CM], frames=M)
ok("midnight-no-date", "Time,CH1\n" + "".join("%s,%s\n" % (over(i)[1], m[i]) for i in range(M)), 40, [CM], frames=M)
ok("clocks-first-and-last", "Index,CH1,Clock\n" + "".join("%d,%s,%s\n" % (i, m[i], "12:00:00" if i == 0 else "12:00:40" if i == M - 1 else "") for i in range(M)),
   None, [CM], frames=M, flags=["rate-doubt"])
jit = [i * 1e-3 + 2e-4 * rnd.uniform(-1, 1) for i in range(M)]
ok("jitter", "Time,CH1\n" + rows(f(jit, 7), m), 1000, [CM], start=float("%.7f" % jit[0]), frames=M, flags=["time-jitter"], tol=2e-4)
ok("jitter-within-rounding", "Time,CH1\n" + rows(f([i * 1e-3 + 4e-8 * rnd.uniform(-1, 1) for i in range(M)], 7), m), 1000, [CM], frames=M, tol=1e-6)
ok("log-spaced-time", "Time,CH1\n" + rows(e([1e-6 * 1.02 ** i for i in range(M)], 6), m), None, [CM], start=1e-6, frames=M, flags=["rate-doubt", "time-jitter"], loose=True)
ok("row-lost", "Time,CH1\n" + "".join("%.4f,%s\n" % (i * 1e-4, m[i]) for i in range(M) if i != 200), 1e4, [chan("CH1", m[:200] + m[201:])], frames=M - 1, flags=["gap"], joints=[200])
ok("row-twice", "Time,CH1\n" + "".join(("%.4f,%s\n" % (i * 1e-4, m[i])) * (2 if i == 200 else 1) for i in range(M)), 1e4,
   [chan("CH1", m[:200] + [m[200]] + m[200:])], frames=M + 1, flags=["duplicate-time"], joints=[201])
ok("raw-counts", "Time,CH1 (counts)\n" + rows(["%.4f" % (i * 1e-4) for i in range(N)], ["%d" % round(100 * float(x)) for x in a]), 1e4,
   [chan("CH1", ["%d" % round(100 * float(x)) for x in a], 1, "")], frames=N, flags=["uncalibrated"])
ok("raw-counts-scaled", "Volts per count,0.01\nTime,CH1 (counts)\n" + rows(["%.4f" % (i * 1e-4) for i in range(N)], ["%d" % round(100 * float(x)) for x in a]), 1e4,
   [chan("CH1", ["%d" % round(100 * float(x)) for x in a], 0.01)], frames=N)
ok("whole-numbers-no-unit", "Time,Data\n" + rows(t6, ["%d" % round(100 * float(x)) for x in a]), 1e4,
   [chan("Data", ["%d" % round(100 * float(x)) for x in a], 1, "")], frames=N, flags=["uncalibrated"])
ok("amperes", "Time (s),I (A),CH1 (V)\n" + rows(t6, b, a), 1e4, [dict(nm(B, "I"), unit=""), A], frames=N, flags=["uncalibrated"])
ok("rows-fewer-than-stated", "Record Length,100\nTime,CH1\n" + rows(t6, a), 1e4, [A], frames=N, flags=["truncated"])
ok("rows-more-than-stated", "Record Length,50\nTime,CH1\n" + rows(t6, a), 1e4, [A], frames=N, flags=["size-mended"])
ok("last-row-cut-cell", "Time,CH1,CH2\n" + rows(t6, a, b)[:-9], 1e4, [chan("CH1", a[:-1]), chan("CH2", b[:-1])], frames=N - 1, flags=["truncated"])
ok("last-row-cut-number", "Time,CH1,CH2\n" + rows(t6, a, b)[:-3], 1e4, [chan("CH1", a[:-1]), chan("CH2", b[:-1])], frames=N - 1, flags=["truncated"])
ok("text-between-rows", "Time,CH1\n" + rows(t6[:30], a[:30]) + "operator touched the cable\n" + rows(t6[30:], a[30:]), 1e4, [A], frames=N, flags=["gap"])
ok("averaged", "Acquisition Mode,Average\nTime,CH1\n" + rows(t6, a), 1e4, [A], frames=N, flags=["averaged"])

# --- refused -----------------------------------------------------------------
bad("decimal-comma-in-comma-file", "Time,CH1\n" + rows(dc(t6), dc(a)), 2, "decimal")
bad("decimal-comma-in-comma-file-bare", rows(dc(t6), dc(a)), 1, "decimal")
bad("both-decimal-marks", "Time;CH1\n" + rows(t6, dc(a), sep=";"), 2, "decimal")
bad("comma-thousands-or-decimals", "Time\tCH1\n" + rows(["%d" % i for i in range(N)], ["1,%03d" % (500 + i) for i in range(N)], sep="\t"), 2, "thousands")
bad("separators-change", "Time,CH1\n" + rows(t6[:30], a[:30]) + rows(t6[30:], a[30:], sep=";"), 31, "commas here", "format")
bad("damaged-cells", "Time;CH1\n" + rows(t6[:40], a[:40], sep=";") + "".join("%s,%s\n" % r for r in zip(t6[40:], a[40:])), 42, "commas", "format")
bad("wide-row", "Time,CH1\n" + rows(t6[:30], a[:30]) + "0.003,1.0,2.0\n" + rows(t6[30:], a[30:]), 32, "3 cells")
bad("narrow-row", "Time,CH1,CH2\n" + rows(t6[:30], a[:30], b[:30]) + "0.003,1.0\n" + rows(t6[30:], a[30:], b[30:]), 32, "fewer cells")
bad("second-table", "Time,CH1\n" + rows(t6[:30], a[:30]) + "\nTime,CH2\n" + rows(t6[:30], b[:30]), 33, "second table", "unsupported")
bad("blocks-under-each-other", "".join("Channel %d\nX0,0\nIncrement,1e-4\n" % c + rows(v) for c, v in ((1, a), (2, b))), 64, "second table", "unsupported")
bad("two-time-axes", "Time1 (s),CH1 (V),Time2 (s),CH2 (V)\n" + rows(t6, a, f([i * 2e-4 for i in range(N)], 6), b), 1, "both time")
bad("header-misfit", "Time (ms),CH1\n" + rows(t6, a, b), 1, "names")
bad("numbers-before-header", "2500,1\nTime,CH1\n" + rows(t6, a), 1, "alone")
bad("stated-twice-unlike", "Sample Rate,1000\nSample Interval,1e-4\nVolts\n" + rows(a), 2, "Sample Interval")
bad("settings-sidecar", "\n".join(kv) + "\n", 1, "settings", "format")
bad("pointer-file", "version https://example.invalid/spec/v1\noid sha256:%064d\nsize 12345\n" % 7, 1, "pointer", "format")
bad("json-cells", 'id,summary\n' + "".join('%d,"{""rms"": %s, ""pk"": 1}"\n' % (i, x) for i, x in enumerate(a[:20])), 2, "structured text", "format")
bad("json-file", '{"rate": 1000, "data": [1, 2, 3]}\n', 1, "braces", "format")
bad("markup", "<html><table><tr><td>0.1</td></tr></table></html>\n", 1, "markup", "format")
bad("binary-bytes", b"Time,CH1\n" + rows(t6, a).encode() + b"\x01\x02\x03\n", 62, "binary", "format")
bad("header-only", "Time (s),CH1 (V)\n", 1, "no samples", "format")
bad("prose", "Dear colleague,\nthe preamp hums.\nRegards\n", 1, "no table", "format")
bad("time-alone", "Time (s)\n" + rows(t6), 2, "no column of values", "format")
bad("text-mixed-in", "Time,CH1\n" + "".join("%s,%s\n" % (t6[i], a[i] if i % 3 else "12-Feb") for i in range(N)), 2, "mixes", "format")
bad("suffix-lost-on-some", "Time,CH1\n" + "".join("%s,%s\n" % (t6[i], suf[i] if i % 4 else suf[i][:-2]) for i in range(N)), 2, "unit behind")

# --- whole exports, as instruments lay them out ------------------------------
ok("export-values-under-settings", "Format,1.0\nMemory Length,%d\nTrigger Level,0.0\nSource,CH1\nProbe,10.000E+00\nVertical Units,V\nVertical Scale,1.000E+00\n"
   "Horizontal Units,S\nHorizontal Scale,5.000E-04\nHorizontal Mode,Main\nSampling Period,1.000E-04\nFirmware,V1.2\nTime,01-Dec-26 12:00:00\nMode,Fast\nWaveform Data,\n" % N
   + rows(a, tail=","), 1e4, [nm(A, "Waveform Data")], frames=N)
ok("export-named-settings-per-channel", "Record Length,Analog:%d\nSample Interval,Analog:0.0001000000\nVertical Units,CH1:V,CH2:V\nVertical Scale,CH1:0.5,CH2:0.2\nProbe Attenuation,CH1:1,CH2:10\n"
   "Horizontal Units,S\nModel,B4\n\n\nSource,CH1,CH2\nSecond,Volt,Volt\n" % N + rows(t6, a, b), 1e4, [A, B], frames=N)
ok("export-segments-numbered", "Bench take,17,Waveform\nSegments,2,SegmentSize,30\nSegment,TrigTime,TimeSinceSegment1\n#1,01-Dec-2026 12:00:00,0\n#2,01-Dec-2026 12:00:07,7.1\nTime,Ampl\n"
   + rows(t6[:30], a[:30]) + rows(t6[:30], a[30:]), 1e4, [nm(A, "Ampl")], frames=N, flags=["gap"], joints=[30])
ok("export-header-with-start", "CH1V,t0 = -3.0e-03,tInc = 1.0e-04,\n" + rows(a, tail=",,,"), 1e4, [nm(A, "CH1V")], start=-0.003, frames=N)
ok("export-hash-settings-values", "#CHANNEL:CH1\n#CLOCK=100.0uS\n#SIZE=%d\n#UNITS:mV\n  \n" % N + "".join("  %s\n" % x for x in a), 1e4, [chan("", a, 1e-3)], frames=N)
ok("export-comment-semicolons", "; recorded on the bench\n; Channels (1/1): A1\n; Samplerate: 10 kHz\nTime [ms],A1 [V]\n" + rows(f([i * 0.1 for i in range(N)], 1), a), 1e4, [nm(A, "A1")], frames=N)
ok("export-hash-block", "#Oscilloscope Acquisition\n#Device Name: bench\n#Serial Number: 0017\n#Date Time: 2026-12-01 12:00:00.123\n#Sample rate: 10000Hz\n#Samples: %d\n#Trigger: Source: Channel 1 Type: Edge\n"
   "#Channel 1\n#Range: 5 V/div\n#Offset: 0 V\n#Attenuation: 1 X\n\nTime (s),Channel 1 (V)\n" % N + rows(t6, a), 1e4, [nm(A, "Channel 1")], frames=N)
ok("export-quoted-block-settings", '"Model Name","B4"\n"BlockNumber",1\n"TraceName ","CH1"\n"BlockSize",%d\n"VUnit","V"\n"SampleRate",10000\n"HResolution",1.0000000E-04\n"HOffset",-3.0000000E-03\n"HUnit","s"\n' % N
   + "".join(" ,%s\n" % x for x in a), 1e4, [nm(A, "")], start=-0.003, frames=N)
ok("export-name-with-unit-inside", "Time (ms) - Voltage_1,Amplitude (mV) - Voltage_1\n" + rows(f([i * 0.1 for i in range(N)], 1), a), 1e4, [chan("Amplitude - Voltage_1", a, 1e-3)], frames=N)
ok("export-volt-capitals", "x-axis,1 (VOLT),2 (VOLT)\n" + rows(t6, a, b), 1e4, [nm(A, "1"), nm(B, "2")], frames=N)
ok("export-simulator", "time\tV(out)\tV(n001)\n" + rows(e([i * 1e-4 for i in range(N)], 9), a, b, sep="\t"), 1e4, [nm(A, "V(out)"), nm(B, "V(n001)")], frames=N)
ok("export-clock-and-ms", "NUM,Date&Time,ms,CH1,Alarm\nNO.,Time,ms,V,A1234\n" + "".join("%d,2026/12/01 12:00:%02d,%4d,%s,LLLL\n" % (i + 1, i // 5, i % 5 * 200, a[i]) for i in range(N)),
   5, [A], frames=N)
ok("export-unit-column", "Date;Time;Value;Unit\n" + "".join("2026-12-01;12:00:%04.1f;%s;mV\n" % (i * 0.5, a[i]) for i in range(N)), 2, [chan("Value", a, 1e-3)], frames=N)
bad("export-unit-column-changes", "Time;Value;Unit\n" + "".join("%s;%s;%s\n" % (t6[i], a[i], "mV" if i < 30 else "V") for i in range(N)), 32, "changes")
ok("export-blank-unit-cells", "".join("%s s %s mV\n" % r for r in zip(t6, a)), 1e4, [chan("", a, 1e-3)], frames=N)
ok("export-spaced-suffix", "Time,CH1\n" + "".join("%s s,%s V DC\n" % r for r in zip(t6, a)), 1e4, [A], frames=N)
ok("export-epoch-ms", "timestamp,CH1\n" + "".join("%d,%s\n" % (1796126400000 + 20 * i, a[i]) for i in range(N)), 50, [A], start=1796126400.0, frames=N)
bad("export-spreadsheet-days", "Date/Time,CH1\n" + "".join("%.9f,%s\n" % (46357.5 + i / 86400, a[i]) for i in range(N)), 2, "calendar")
ok("export-arrow-clock", "".join("12:00:%06.3f -> %s\n" % (i * 0.02, a[i]) for i in range(N)), 50, [nm(A, "")], frames=N)
ok("export-peak-detect-names", "TIME,CH1,CH1 Peak Detect\n" + rows(t6, a, b), 1e4, [A, nm(B, "CH1 Peak Detect")], frames=N, flags=["peak-detect"])
ok("export-units-above-names", "s,mV\nTime,CH1\n" + rows(t6, a), 1e4, [chan("CH1", a, 1e-3)], frames=N)
ok("export-iso-zone", "Time,CH1\n" + "".join("2026-12-01T12:00:%09.6f+01:00,%s\n" % (i * 1e-4, a[i]) for i in range(N)), 1e4, [A], frames=N)
ok("export-am-pm", "Time,CH1\n" + "".join("12/1/2026 %d:%02d:%02d %s,%s\n" % (11 if i < 20 else 12, (59 if i < 20 else 0), (40 + i) % 60, "AM" if i < 20 else "PM", a[i]) for i in range(N)), 1, [A], frames=N)
ok("export-minutes-seconds", "Time,CH1\n" + "".join("%02d:%04.1f,%s\n" % (i * 5 // 60, i * 5 % 60, a[i]) for i in range(N)), 0.2, [A], frames=N)
bad("export-rows-across", "\n".join(",".join(["CH%d" % c] + a) for c in (1, 2)) + "\n", 0, "row", "format")
bad("export-rows-across-bare", "\n".join(",".join(a) for c in (1, 2)) + "\n", 1, "along the rows", "unsupported")
bad("export-signs-apart", "".join("%s %s %s\n" % (t6[i], "-" if a[i][0] == "-" else "+", a[i].strip("-")) for i in range(N)), 1, "signs apart", "format")
bad("export-burst-rows", "trigger,stamp,channel,rate,data\n" + "".join("%d,%d,1,1000,%s\n" % (i, i * 8, ",".join(a[i * 5:i * 5 + 5])) for i in range(12)), 1, "names")
bad("export-first-row-longer", "Time,CH1\n" + t6[0] + "," + a[0] + ",CH1,start\n" + rows(t6[1:], a[1:]), 2, "4 cells")
bad("export-time-two-forms", "Time,CH1\n" + "".join("%s,%s\n" % ("%.1f" % (i * 1.5) if i < 40 else "%d:%04.1f" % divmod(i * 1.5, 60), a[i]) for i in range(N)), 42, "clock times")
bad("export-time-two-forms-first", "Time,CH1\n" + "".join("%s,%s\n" % ("%.1f" % (i * 4) if i < 15 else "%d:%04.1f" % divmod(i * 4, 60), a[i]) for i in range(N)), 16, "clock times")
ok("export-shuffled-columns", "CH1 (V),CH2 (V),Time (s)\n" + rows(a, b, t6), 1e4, [A, B], frames=N)
ok("export-sep-line", "sep=;\nTime;CH1\n" + rows(t6, a, sep=";"), 1e4, [A], frames=N)
ok("export-grouped-european", "Zeit (s);U (mV)\n" + "".join("%s;%s\n" % (t6[i].replace(".", ","), "{:,.2f}".format(1500 * float(a[i])).translate(str.maketrans(",.", ".,"))) for i in range(N)),
   1e4, [chan("U", ["%.2f" % (1500 * float(x)) for x in a], 1e-3)], frames=N)
ok("export-double-spaced", "Time,CH1\n\n" + "\n\n".join("%s,%s" % r for r in zip(t6, a)) + "\n\n", 1e4, [A], frames=N)
ok("export-values-double-spaced", "Sample rate: 10 kHz\n" + "\n\n".join(a) + "\n", 1e4, [nm(A, "")], frames=N)
ok("export-values-blank-row", "Sample rate: 10 kHz\n" + "\n".join(a[:30]) + "\n\n" + "\n".join(a[30:]) + "\n", 1e4, [nm(A, "")], frames=N, flags=["gap"], joints=[30])
ok("export-time-minutes", "Time (min),CH1 (V)\n" + rows(f([i * 0.5 for i in range(N)], 1), a), 1 / 30, [A], frames=N)
ok("export-stated-float32", "Sample Interval,9.99999975E-05\nTime,CH1\n" + rows(t6, a), 1e4, [A], frames=N, tol=1e-6)
ok("export-unix-seconds", "time,CH1\n" + "".join("%.3f,%s\n" % (1796126400 + 0.02 * i, a[i]) for i in range(N)), 50, [A], start=1796126400.0, frames=N)
ok("export-one-row", "Time,CH1\n0.0,1.5\n", None, [chan("CH1", ["1.5"])], frames=1, flags=["rate-doubt"])
ok("export-two-rows", "Time,CH1\n0.0,1.5\n0.1,2.5\n", 10, [chan("CH1", ["1.5", "2.5"])], frames=2)
ok("export-bad-first-row", "Time,CH1\n" + t6[0] + ",####\n" + rows(t6[1:], a[1:]), 1e4, [chan("CH1", a[1:])], frames=N, flags=["overrange"])
ok("export-word-first-row", "Time,CH1\n" + t6[0] + ",oops\n" + rows(t6[1:], a[1:]), 1e4, [chan("CH1", a[1:])], frames=N, flags=["overrange"])
ok("export-damaged-time", "Time,CH1\n" + rows(holes(t6, {20: "0.0o2"}), a), 1e4, [A], frames=N, flags=["overrange"])
ok("export-index-gap", "Sample,CH1 (V)\n" + "".join("%d,%s\n" % (i, a[i]) for i in range(N) if i != 31) + "Sample rate,10000\n", 1e4, [chan("CH1", a[:31] + a[32:])], frames=N - 1, flags=["gap"], joints=[31])

ok("names-single-letters", "Time,A,C\n" + rows(t6, a, b), 1e4, [nm(A, "A"), nm(B, "C")], frames=N)
ok("names-t-and-v", "t,V\n" + rows(t6, a), 1e4, [nm(A, "V")], frames=N)
ok("name-one-letter-values", "Sample rate: 10 kHz\nA\n" + rows(a), 1e4, [nm(A, "A")], frames=N)
bad("frequency-behind-row-numbers", "#,Frequency in Hz,Gain in dB\n" + "".join("%d,%.1f,%s\n" % (i, 10 * 1.2 ** i, a[i]) for i in range(40)), 1, "frequency", "unsupported")
ok("x-and-y", "x,y\n" + rows(t6, a), 1e4, [nm(A, "y")], frames=N)
ok("settings-in-the-middle", "Time,CH1\n" + rows(t6[:30], a[:30]) + "Model,B4\nSample Interval,1E-4\n" + rows(t6[30:], a[30:]), 1e4, [A], frames=N, flags=["gap"])

unit = ["Points", "s", "Samples", "s"]
ok("settings-beside-with-units", "".join('%s%s,%s\n' % ('"%s",%s,%s,' % (side[i][0], side[i][1], unit[i] if i < 4 else "") if i < len(side) else ",,,", tn[i], a[i]) for i in range(N)),
   1e4, [nm(A, "")], start=-0.003, frames=N)
ok("settings-beside-under-header", "Model,B4,,TIME,CH1\nSN,17,,s,mV\n" + "".join("%s%s,%s\n" % (["Record Length,%d,," % N, "Sample Interval,1e-4,,"][i] if i < 2 else ",,,", tn[i], a[i]) for i in range(N)),
   1e4, [chan("CH1", a, 1e-3)], start=-0.003, frames=N)
ok("export-index-aligned", "Save Time : 2026-12-01 12:00:00\nTime Base : 1.0ms\nSampling Rate : 10KSa/s\nAmplitude : 1.0V\nFrequency : 477.5Hz\nUnit : (mV)\n\n"
   "index                CH1_Voltage(mV)      CH2_Voltage(mV)\n" + "".join("%-20d %-20s %s\n" % (i, a[i], b[i]) for i in range(N)), 1e4,
   [chan("CH1_Voltage", a, 1e-3), chan("CH2_Voltage", b, 1e-3)], frames=N)
ok("export-label-row", "Model,M4\nFirmware Version,1\n\nPoint Format,Y,\nHorizontal Units,s,\nHorizontal Scale,4e-05,\nSample Interval,1e-04,\nRecord Length,%d,\nGating,0.0%% to 100.0%%,\nProbe Attenuation,1,\n"
   "Vertical Units,V,\nVertical Offset,0,\nVertical Scale,0.5,\nVertical Position,-0.1,\n,,\n,,\n,,\nLabel,,\nTIME,CH1,\n" % N + rows(t6, a, tail=","), 1e4, [A], frames=N)
ok("export-quoted-axis-settings", '"Title","Output"\n"X Unit:","s"\n"Y Unit:","V"\n"X At 0%%:","0.0"\n"X Resolution:","1.00000E-04"\n"X Size:","%d"\n"X Label:","100 us/Div"\n\n' % N
   + "".join('"%s","%s"\n' % r for r in zip(t6, a)), 1e4, [nm(A, "")], frames=N)
ok("export-runs-side-by-side", "Run 1: Time (s),Run 1: Potential (V),Run 2: Time (s),Run 2: Potential (V)\n" + rows(t6, a, t6, b), 1e4,
   [nm(A, "Run 1: Potential"), nm(B, "Run 2: Potential")], frames=N)
ok("export-in-s-in-v", "in s,C1 in V,C2 in mV\n" + rows(t6, a, b), 1e4, [nm(A, "C1 in V"), chan("C2 in mV", b, 1e-3)], frames=N)
ok("export-coupling-row", "Time,CH1,CH2\ns,V,mV\nDC,DC,AC\n" + rows(t6, a, b), 1e4, [A, chan("CH2", b, 1e-3)], frames=N)
ok("export-start-clock-rows", "".join("12:00:0%d\n" % s + rows(t6[:20], a[20 * s:20 * s + 20]) for s in range(3)), 1e4, [nm(A, "")], frames=N, flags=["gap"], joints=[20, 40])
ok("export-start-date-row", "01.12.2026;12:00:00\n" + rows(t6, a, sep=";"), 1e4, [nm(A, "")], frames=N)
ok("export-time-and-spectrum", "Time (s),CH1 (V),Frequency (Hz),FFT (dBV)\n" + "".join("%s,%s,%s,%s\n" % (t6[i], a[i], i * 100 if i < 30 else "", b[i] if i < 30 else "") for i in range(N)), 1e4,
   [A, chan("Frequency", ["%d" % (i * 100) for i in range(30)], 1, ""), chan("FFT", b[:30], 1, "")], frames=N, flags=["overrange", "uncalibrated"])
seg = "Channels\t1\t\nSamples\t30\t\nDate\t2026/12/01\t\nTime\t12:00:0%d.5\t\nY_Unit_Label\tVolts\t\nX_Dimension\tTime\t\nX0\t0.0\t\nDelta_X\t1.000000E-4\t\n***End_of_Header***\t\t\nX_Value\tVoltage\tComment\n"
ok("export-segments-with-headers", "Measurement\t\nSeparator\tTab\nMulti_Headings\tYes\nDate\t2026/12/01\nTime\t12:00:00.1\n***End_of_Header***\t\n\t\n" + seg % 1 + rows(t6[:30], a[:30], sep="\t")
   + "\t\t\n" + seg % 2 + rows(t6[:30], a[30:], sep="\t"), 1e4, [nm(A, "Voltage")], frames=N, flags=["gap"], joints=[30])

json.dump(truth, open(os.path.join(here, "shapes.json"), "w"), indent=1, sort_keys=True)
print(len(truth), "shapes")
