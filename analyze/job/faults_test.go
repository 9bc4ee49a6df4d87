package job

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"unicode/utf8"
)

// base is a sound job; the cases below go before or after it.
const base = `format = 1
[gear.box]
kind = "audio"
[gear.scope]
kind = "scope"
[takes.tone]
file = "tone.wav"
in = 2
[takes.quiet]
file = "quiet.wav"
[takes.dc]
file = "dc.csv"
gear = "scope"
`

// mark stands in a case's text where a fault is expected; the tests take it
// out and work its line and column out themselves.
const mark = "¦"

// unmark returns the text without marks, and "line:column" of each.
func unmark(text string) (string, []string) {
	var places []string
	for {
		i := strings.Index(text, mark)
		if i < 0 {
			return text, places
		}
		before := text[:i]
		line := strings.Count(before, "\n") + 1
		col := utf8.RuneCountInString(before[strings.LastIndex(before, "\n")+1:]) + 1
		places = append(places, fmt.Sprintf("%d:%d", line, col))
		text = before + text[i+len(mark):]
	}
}

func check(s string) string { return base + "[[checks]]\nname = \"x\"\n" + s }

func gain(s string) string { return check("measure = \"gain\"\ntake = \"tone\"\n" + s) }

func level(s string) string { return check("measure = \"level\"\ntake = \"tone\"\n" + s) }

// Each job holds the marked faults and no other; each message names what it
// must.
var faulty = []struct {
	name  string
	text  string
	parts []string // one per mark: words of the message, split at |
}{
	// words nobody knows, and the nearest one
	{"unknown top key", "¦titel = \"x\"\n" + base, []string{"unknown key `titel`|did you mean `title`?"}},
	{"unknown table", base + "[¦check]\n", []string{"unknown key `check`|`checks`"}},
	{"unknown unit of gear", base + "[gear.b]\nkind = \"audio\"\n¦cuopling = \"ac\"\n", []string{"[gear.b]|did you mean `coupling`?"}},
	{"channel key at gear only", base + "[gear.box.channel.2]\n¦clock = \"10 ppm\"\n", []string{"unknown key `clock` in [gear.box.channel.2]"}},
	{"unknown take key", base + "[takes.a]\nfile = \"a.wav\"\n¦spam = 1\n", []string{"unknown key `spam`|did you mean `span`?"}},
	{"check key in a take", base + "[takes.a]\nfile = \"a.wav\"\n¦weighting = \"A\"\n", []string{"it is a key of checks"}},
	{"unknown csv key", base + "[takes.a.csv]\n¦decimals = \",\"\n[takes.a]\nfile = \"a.wav\"\n", []string{"[takes.a.csv]|did you mean `decimal`?"}},
	{"unknown check key", gain("¦att = \"1 kHz\"\n"), []string{"unknown key `att` in a check|did you mean `at`?"}},
	{"unknown record key", base + "[record]\n¦operater = \"K\"\n", []string{"did you mean `operator`?"}},
	{"unknown rule key", base + "[rule]\n¦k = 2\n", []string{"[rule]|expected `decision` or `coverage`"}},
	{"unknown default", base + "[defaults]\n¦wieghting = \"A\"\n", []string{"[defaults]|did you mean `weighting`?"}},
	{"unknown waiver key", gain("waiver = { by = \"K\", why = \"w\", ¦tiket = \"t\" }\n"), []string{"did you mean `ticket`?"}},
	{"key of another measure", gain("¦band = \"20 Hz .. 20 kHz\"\n"), []string{"measure `gain` does not take the key `band`|belongs to `level`, `thd`"}},
	{"key of another measure, weighting", level("¦weighting = \"A\"\n"), []string{"`noise`"}},
	{"key of one-take measures at cmrr", check("measure = \"cmrr\"\n¦take = \"tone\"\ndifferential = \"tone\"\ncommon = \"tone\"\n"), []string{"measure `cmrr` does not take the key `take`"}},
	{"unknown measure", check("measure = ¦\"gian\"\ntake = \"tone\"\n"), []string{"unknown measure \"gian\"|did you mean `gain`?"}},
	{"unknown measure, far off", check("measure = ¦\"warmth\"\ntake = \"tone\"\n"), []string{"unknown measure \"warmth\"|measure --help"}},
	{"unknown take", check("measure = \"level\"\ntake = ¦\"tnoe\"\n"), []string{"unknown take \"tnoe\"|did you mean `tone`?"}},
	{"unknown take, listed", check("measure = \"level\"\ntake = ¦\"zebra\"\n"), []string{"there is `tone`, `quiet` or `dc`"}},
	{"unknown take in a list", check("measure = \"level\"\neach = [\"tone\", ¦\"quit\"]\n"), []string{"`each`: unknown take \"quit\"|`quiet`"}},
	{"unknown take as floor", level("floor = ¦\"floor\"\n"), []string{"`floor`: unknown take"}},
	{"unknown gear", base + "[takes.a]\nfile = \"a.wav\"\ngear = ¦\"bxo\"\n", []string{"unknown gear \"bxo\"|did you mean `box`?"}},
	{"unknown word", gain("class = ¦\"mayor\"\n"), []string{"`class`: unknown word \"mayor\"|did you mean `major`?|`critical`"}},
	{"unknown decision", base + "[rule]\ndecision = ¦\"strict\"\n", []string{"expected `four-way`, `guarded` or `simple`"}},
	{"unknown weighting", check("measure = \"noise\"\ntake = \"quiet\"\nweighting = ¦\"a\"\n"), []string{"did you mean `A`?"}},
	{"weighting without quotes", check("measure = \"noise\"\ntake = \"quiet\"\nweighting = ¦468\n"), []string{`write "468"`}},
	{"unknown setup", base + "[takes.a]\nfile = \"a.wav\"\nsetup = ¦\"endshort\"\n", []string{"did you mean `end-short`?"}},
	{"version of the form", "format = ¦2\n" + base[len("format = 1\n"):], []string{"`format`: got 2, expected a whole number from 1 to 1"}},

	// quantities and units
	{"wrong unit", gain("at = ¦\"40 dB\"\n"), []string{"`at`: \"40 dB\" is a ratio, expected a frequency, like \"1 kHz\""}},
	{"limit in another unit", gain("min = ¦\"3 V\"\n"), []string{"`min`: \"3 V\" is a voltage, expected a ratio, like \"40 dB\""}},
	{"bare number", gain("min = ¦39.5\n"), []string{`write "39.5 dB"`}},
	{"bare whole number", gain("at = ¦1042\n"), []string{`write "1042 Hz"`}},
	{"bare number in quotes", gain("max = ¦\"40.5\"\n"), []string{`"40.5" has no unit: write "40.5 dB"`}},
	{"bare level", level("min = ¦1.2\n"), []string{`write "1.2 V"`}},
	{"decimal comma", gain("min = ¦\"39,5 dB\"\n"), []string{`decimal comma: write "39.5 dB"`}},
	{"decimal comma in a range", level("band = ¦\"20 Hz .. 22,05 kHz\"\n"), []string{"decimal comma|22.05 kHz"}},
	{"no number", gain("min = ¦\"about forty\"\n"), []string{"expected a number with a unit"}},
	{"misspelt unit", gain("at = ¦\"1 KHz\"\n"), []string{"unknown unit \"KHz\"|did you mean \"kHz\"?"}},
	{"NaN limit", gain("min = ¦nan\n"), []string{"expected a finite number"}},
	{"infinite limit", gain("max = ¦inf\n"), []string{"expected a finite number"}},
	{"NaN in quotes", gain("max = ¦\"NaN dB\"\n"), []string{"not a finite number"}},
	{"infinite in quotes", gain("max = ¦\"-inf dB\"\n"), []string{"not a finite number"}},
	{"huge", gain("max = ¦\"1e9 dB\"\n"), []string{"out of range"}},
	{"min above max", gain("min = \"41 dB\"\nmax = ¦\"40 dB\"\n"), []string{"`max` \"40 dB\" lies below `min` \"41 dB\""}},
	{"limits in two units", gain("min = \"39 dB\"\nmax = ¦\"110 x\"\n"), []string{"one unit"}},
	{"band backwards", level("band = ¦\"20 kHz .. 20 Hz\"\n"), []string{"runs backwards"}},
	{"band open", level("band = ¦\"20 Hz ..\"\n"), []string{"open end"}},
	{"band from zero", level("band = ¦\"0 Hz .. 20 kHz\"\n"), []string{"at or below 0"}},
	{"band with a dash", level("band = ¦\"20 Hz - 20 kHz\"\n"), []string{`write "20 Hz .. 20 kHz"`}},
	{"band in seconds", level("band = ¦\"1 s .. 2 s\"\n"), []string{"is a range of time"}},
	{"span backwards", level("span = ¦\"7 s .. 1 s\"\n"), []string{"runs backwards"}},
	{"span of a take backwards", base + "[takes.a]\nfile = \"a.wav\"\nspan = ¦\"7 s .. 1 s\"\n", []string{"`span`|runs backwards"}},
	{"span without a unit", level("span = ¦\"1 .. 7\"\n"), []string{"has no unit"}},
	{"count with a unit", check("measure = \"events\"\ntake = \"tone\"\nmax = ¦\"0 V\"\n"), []string{`a plain count in quotes, like "0"`}},
	{"count without quotes", check("measure = \"events\"\ntake = \"tone\"\nmax = ¦0\n"), []string{`write "0"`}},
	{"dc in decibels", check("measure = \"dc\"\ntake = \"dc\"\nmax = ¦\"-40 dBV\"\n"), []string{"in decibels"}},
	{"peak in dBFS", check("measure = \"peak\"\ntake = \"tone\"\nmax = ¦\"-1 dBFS\"\n"), []string{"dBFS relates an RMS"}},
	{"against, limit in V", level("against = \"quiet\"\nmax = ¦\"1 V\"\n"), []string{"is a voltage, expected a ratio"}},
	{"against, limit in %", level("against = \"quiet\"\nmax = ¦\"1 %\"\n"), []string{"a difference in dB"}},
	{"negative frequency", gain("at = ¦\"-5 Hz\"\n"), []string{"not above 0"}},
	{"list for one frequency", gain("at = ¦[\"1 kHz\", \"2 kHz\"]\n"), []string{"expected one value"}},
	{"same frequency twice", check("measure = \"cmrr\"\ndifferential = \"tone\"\ncommon = \"tone\"\nat = [\"1 kHz\", ¦\"1000 Hz\"]\n"), []string{"stands twice"}},
	{"gain not above 0", check("measure = \"ein\"\ntake = \"quiet\"\nsource = \"150 ohm\"\ngain = ¦\"-40 x\"\n"), []string{"not above 0"}},
	{"drop as a negative number", check("measure = \"corner_low\"\ntake = \"tone\"\ndrop = ¦\"-3 dB\"\n"), []string{"write it as a positive number"}},
	{"mains in volts", base + "[mains]\nfrequency = ¦\"230 V\"\n", []string{"expected a frequency"}},
	{"mains word", base + "[mains]\nfrequency = ¦\"fnd\"\n", []string{"did you mean `find`?"}},

	// numbers, words, text
	{"harmonics 0", check("measure = \"thd\"\ntake = \"tone\"\nharmonics = ¦0\n"), []string{"from 1 to 100"}},
	{"harmonics 101", check("measure = \"thd\"\ntake = \"tone\"\nharmonics = ¦101\n"), []string{"from 1 to 100"}},
	{"harmonics in quotes", check("measure = \"thd\"\ntake = \"tone\"\nharmonics = ¦\"10\"\n"), []string{"without quotes: write 10"}},
	{"harmonics with a fraction", check("measure = \"thd\"\ntake = \"tone\"\nharmonics = ¦2.5\n"), []string{"whole number"}},
	{"harmonics past 64 bits", check("measure = \"thd\"\ntake = \"tone\"\nharmonics = ¦99999999999999999999\n"), []string{"whole number"}},
	{"order 1", check("measure = \"harmonic\"\ntake = \"tone\"\norder = ¦1\n"), []string{"from 2 to 100"}},
	{"coverage 0", base + "[rule]\ncoverage = ¦0\n", []string{"a number above 0"}},
	{"coverage negative", base + "[rule]\ncoverage = ¦-2\n", []string{"a number above 0"}},
	{"coverage nan", base + "[rule]\ncoverage = ¦nan\n", []string{"a number above 0"}},
	{"optional in quotes", gain("optional = ¦\"yes\"\n"), []string{"true or false, without quotes"}},
	{"name as a number", base + "[[checks]]\nname = ¦7\nmeasure = \"level\"\ntake = \"tone\"\n", []string{`write "7"`}},
	{"name empty", base + "[[checks]]\nname = ¦\" \"\nmeasure = \"level\"\ntake = \"tone\"\n", []string{"the name is empty"}},
	{"date that is none", base + "[record]\ndate = ¦\"1 December 2026\"\n", []string{"a date like 2026-12-01"}},
	{"date of month 13", base + "[record]\ndate = ¦2026-13-01\n", []string{"a date like 2026-12-01"}},
	{"text where a table stands", "unit = ¦\"SP-017\"\n" + base, []string{"expected a table"}},
	{"checks as one table", base + "[¦checks]\nname = \"x\"\n", []string{"[[checks]]"}},
	{"where as text", gain("where = ¦\"40 dB\"\n"), []string{"expected a table"}},

	// gear
	{"full scale 0", base + "[gear.b]\nkind = \"audio\"\nfull_scale_peak = ¦\"0 V\"\n", []string{"not above 0"}},
	{"full scale negative", base + "[gear.b]\nkind = \"audio\"\nfull_scale_peak = ¦\"-4.92 V\"\n", []string{"not above 0"}},
	{"full scale bare", base + "[gear.b]\nkind = \"audio\"\nfull_scale_peak = ¦4.92\n", []string{`write "4.92 V"`}},
	{"both full scales", base + "[gear.b]\nkind = \"audio\"\nfull_scale_peak = \"4.92 V\"\n¦full_scale_sine = \"13 dBu\"\n", []string{"both `full_scale_peak` and `full_scale_sine`"}},
	{"full scale of a scope", base + "[gear.b]\nkind = \"scope\"\n¦full_scale_peak = \"4.92 V\"\n", []string{"a scope has no full scale"}},
	{"full scale peak in dBu", base + "[gear.b]\nkind = \"audio\"\nfull_scale_peak = ¦\"13 dBu\"\n", []string{"in decibels"}},
	{"probe of a recorder", base + "[gear.b]\nkind = \"audio\"\n¦probe = 10\n", []string{"belongs to a scope"}},
	{"probe 0", base + "[gear.b]\nkind = \"scope\"\nprobe = ¦0\n", []string{"above 0"}},
	{"gear without kind", base + "[gear.¦b]\ncoupling = \"ac\"\n", []string{"says no kind"}},
	{"kind", base + "[gear.b]\nkind = ¦\"recorder\"\n", []string{"expected `audio` or `scope`"}},
	{"channel 0 of gear", base + "[gear.box.channel.¦0]\ncoupling = \"ac\"\n", []string{"a number from 1 up"}},
	{"channel by name of gear", base + "[gear.box.channel.¦left]\ncoupling = \"ac\"\n", []string{"a number from 1 up"}},
	{"uncertainty negative", base + "[gear.b]\nkind = \"audio\"\nuncertainty = ¦\"-1 %\"\n", []string{"positive number"}},
	{"uncertainty as a level", base + "[gear.b]\nkind = \"audio\"\nfull_scale_peak = \"4.92 V\"\nuncertainty = ¦\"0.1 dBu\"\n", []string{"written in dB"}},
	{"uncertainty in Hz", base + "[gear.b]\nkind = \"audio\"\nuncertainty = ¦\"3 Hz\"\n", []string{"expected %, dB or a unit of `full_scale_peak`"}},
	{"uncertainty in V of nothing", base + "[gear.b]\nkind = \"scope\"\nuncertainty = ¦\"3 mV\"\n", []string{"needs a full scale"}},
	{"unknown misspelt", base + "[gear.b]\nkind = \"audio\"\nuncertainty = ¦\"unkown\"\n", []string{`did you mean "unknown"?`}},

	// takes, channels, paths
	{"take without a file", base + "[takes.¦a]\nin = 2\n", []string{"names no file"}},
	{"channel 0", base + "[takes.a]\nfile = \"a.wav\"\nout = ¦0\n", []string{"a channel from 1 up"}},
	{"channel -1 of a check", level("out = ¦-1\n"), []string{"a channel from 1 up"}},
	{"channel beyond the file", base + "[takes.a]\nfile = \"a.wav\"\nout = ¦3\n", []string{"channel 3 is not there|channels 1, 2"}},
	{"check's channel beyond the file", level("out = ¦5\n"), []string{"take `tone`|channel 5 is not there"}},
	{"difference beyond the file", level("out = ¦\"1-3\"\n"), []string{"\"1-3\""}},
	{"column nobody wrote", check("measure = \"level\"\ntake = \"dc\"\nout = ¦\"CH3\"\n"), []string{"no channel \"CH3\"|1 (CH1), 2 (CH2)"}},
	{"difference with itself", level("out = ¦\"2-2\"\n"), []string{"the difference of two channels"}},
	{"backslash path", base + "[takes.a]\nfile = ¦'takes\\a.wav'\n", []string{"use / in paths"}},
	{"backslash path as an escape", base + "[takes.a]\nfile = \"takes¦\\a.wav\"\n", []string{"use / in paths"}},
	{"path that climbs", base + "[takes.a]\nfile = ¦\"../a.wav\"\n", []string{"\"../a.wav\" climbs|--allow-outside"}},
	{"path that comes back", base + "[takes.a]\nfile = ¦\"takes/../a.wav\"\n", []string{"climbs"}},
	{"absolute path", base + "[takes.a]\nfile = ¦\"/etc/passwd\"\n", []string{"\"/etc/passwd\" is an absolute path"}},
	{"drive letter", base + "[takes.a]\nfile = ¦\"C:/takes/a.wav\"\n", []string{"is an absolute path"}},
	{"empty path", base + "[takes.a]\nfile = ¦\"\"\n", []string{"is empty"}},
	{"stimulus outside", base + "[takes.a]\nfile = \"a.wav\"\nstimulus = ¦\"../sweep.wav\"\n", []string{"climbs"}},
	{"stimulus of no kind", base + "[takes.a]\nfile = \"a.wav\"\nstimulus = ¦\"sweeep from=20Hz to=20kHz\"\n", []string{"`stimulus`: unknown kind|sweep"}},
	{"stimulus with a comma", base + "[takes.a]\nfile = \"a.wav\"\nstimulus = ¦\"sweep length=0,5s\"\n", []string{"`stimulus`|0.5"}},
	{"include outside", "include = [¦\"../gear.toml\"]\n" + base, []string{"climbs"}},
	{"include missing", "include = [¦\"gear.toml\"]\n" + base, []string{"no such file"}},
	{"include as text", "include = ¦\"gear.toml\"\n" + base, []string{"a list of files"}},
	{"csv word", base + "[takes.a]\nfile = \"a.csv\"\ncsv.separator = ¦\"comma\"\n", []string{"`csv.separator`: unknown word"}},
	{"csv rate bare", base + "[takes.a]\nfile = \"a.csv\"\ncsv.rate = ¦48000\n", []string{`write "48000 Hz"`}},
	{"csv skip negative", base + "[takes.a]\nfile = \"a.csv\"\ncsv.skip = ¦-1\n", []string{"from 0 up"}},
	{"uncertainty of nothing in a take", base + "[takes.a]\nfile = \"a.wav\"\n¦in_uncertainty = \"1 %\"\n", []string{"belongs to `in_level`"}},

	// names twice
	{"key twice", gain("at = \"1 kHz\"\n¦at = \"2 kHz\"\n"), []string{"`at` is given twice, first in job.toml:18"}},
	{"take twice", base + "[takes.¦tone]\nfile = \"b.wav\"\n", []string{"`tone` is given twice, first in job.toml:6"}},
	{"checks of one name", check("measure = \"level\"\ntake = \"tone\"\n[[checks]]\nname = ¦\"x\"\nmeasure = \"level\"\ntake = \"quiet\"\n"), []string{"`x` is defined twice, first in job.toml:15"}},
	{"row of each and a check", check("measure = \"level\"\neach = [\"tone\", \"quiet\"]\n[[checks]]\nname = ¦\"x: tone\"\nmeasure = \"level\"\ntake = \"quiet\"\n"), []string{"`x: tone` is defined twice"}},
	{"take twice in each", check("measure = \"level\"\neach = [\"tone\", ¦\"tone\"]\n"), []string{"stands twice"}},

	// what a check lacks or has too much of
	{"no name", base + "[[¦checks]]\nmeasure = \"level\"\ntake = \"tone\"\n", []string{"has no name"}},
	{"no measure", base + "[[¦checks]]\nname = \"x\"\ntake = \"tone\"\n", []string{"says no measure"}},
	{"no take", base + "[[¦checks]]\nname = \"x\"\nmeasure = \"level\"\n", []string{"names no take"}},
	{"take and each", level("¦each = [\"quiet\"]\n"), []string{"both `take` and `each`"}},
	{"list of takes for one", check("measure = \"level\"\ntake = ¦[\"tone\", \"quiet\"]\n"), []string{"each = [...]"}},
	{"each as text", check("measure = \"level\"\neach = ¦\"tone\"\n"), []string{"a list of takes"}},
	{"empty each", check("measure = \"level\"\neach = ¦[]\n"), []string{"the list is empty"}},
	{"repeat of one", check("measure = \"level\"\nrepeat = ¦[\"tone\"]\n"), []string{"two takes or more"}},
	{"cmrr without common", strings.Replace(check("measure = \"cmrr\"\ndifferential = \"tone\"\n"), "[[checks", "[[¦checks", 1), []string{"needs `common`"}},
	{"gain without an input", strings.Replace(check("measure = \"gain\"\ntake = \"quiet\"\n"), "[[checks", "[[¦checks", 1), []string{"needs `in`, `in_level` or `in_take`"}},
	{"ein without gain", strings.Replace(check("measure = \"ein\"\ntake = \"quiet\"\nsource = \"150 ohm\"\n"), "[[checks", "[[¦checks", 1), []string{"needs `gain` or `gain_take`"}},
	{"power without load", strings.Replace(check("measure = \"power\"\ntake = \"tone\"\n"), "[[checks", "[[¦checks", 1), []string{"needs `load`"}},
	{"difference distortion without order", strings.Replace(check("measure = \"difference_distortion\"\ntake = \"tone\"\n"), "[[checks", "[[¦checks", 1), []string{"needs `order`"}},
	{"entered without value", strings.Replace(check("measure = \"entered\"\n"), "[[checks", "[[¦checks", 1), []string{"needs `value`"}},
	{"entered with limits of another kind", check("measure = \"entered\"\nvalue = \"15 V\"\nmax = ¦\"3 A\"\n"), []string{"is a current, expected a voltage"}},
	{"uncertainty of another kind", check("measure = \"entered\"\nvalue = \"15 V\"\nuncertainty = ¦\"3 A\"\n"), []string{"a unit of `value`"}},
	{"uncertainty of nothing", check("measure = \"power\"\ntake = \"tone\"\nload = \"8 ohm\"\n") + "[[checks]]\nname = \"y\"\nmeasure = \"corner_low\"\ntake = \"tone\"\n¦resistance_uncertainty = \"1 %\"\n", []string{"belongs to `resistance`"}},
	{"waiver without why", gain("¦waiver = { by = \"K\" }\n"), []string{"`why`"}},

	// nominal, within, tables, limits of another slip
	{"nominal alone", gain("¦nominal = \"40 dB\"\n"), []string{"needs `within`"}},
	{"within alone", gain("¦within = \"0.5 dB\"\n"), []string{"needs `nominal` or `limits_from`"}},
	{"nominal and min", gain("nominal = \"40 dB\"\nwithin = \"1 dB\"\n¦min = \"39 dB\"\n"), []string{"both `min` and `nominal`"}},
	{"within in % of a level", gain("nominal = \"40 dB\"\nwithin = ¦\"1 %\"\n"), []string{"a distance in dB"}},
	{"within in dB of volts", level("nominal = \"1 V\"\nwithin = ¦\"1 dB\"\n"), []string{"a distance in V or in %"}},
	{"within of another kind", level("nominal = \"1 V\"\nwithin = ¦\"1 Hz\"\n"), []string{"a distance in V or in %"}},
	{"within negative", gain("nominal = \"40 dB\"\nwithin = ¦\"-0.5 dB\"\n"), []string{"positive number"}},
	{"within bare", gain("nominal = \"40 dB\"\nwithin = ¦0.5\n"), []string{`write "0.5 dB"`}},
	{"table without each", gain("nominal = ¦{ tone = \"40 dB\" }\nwithin = \"1 dB\"\n"), []string{"goes with `each`"}},
	{"table names another take", check("measure = \"level\"\neach = [\"tone\"]\nmax = { tone = \"1 V\", ¦quiet = \"2 V\" }\n"), []string{"take \"quiet\" is not in `each`"}},
	{"table lacks a take", check("measure = \"level\"\neach = [\"tone\", \"quiet\"]\n¦max = { tone = \"1 V\" }\n"), []string{"take \"quiet\" of `each` has no entry"}},
	{"wrong unit in a table", check("measure = \"level\"\neach = [\"tone\", \"quiet\"]\nmax = { tone = \"1 V\", quiet = ¦\"2 Hz\" }\n"), []string{"is a frequency"}},
	{"limits_from outside", gain("limits_from = ¦\"../slip.json\"\nwithin = \"1 dB\"\n"), []string{"climbs"}},
	{"limits_from missing", gain("limits_from = ¦\"golden/slip.json\"\nwithin = \"1 dB\"\n"), []string{"no such file"}},
	{"limits_from without within", gain("¦limits_from = ¦\"golden/slip.json\"\n"), []string{"needs `within`", "no such file"}},
	{"default with a wrong unit", base + "[defaults]\nat = ¦\"3 V\"\n[[checks]]\nname = \"x\"\nmeasure = \"gain\"\ntake = \"tone\"\n[[checks]]\nname = \"y\"\nmeasure = \"gain\"\ntake = \"tone\"\n", []string{"expected a frequency"}},

	// the text itself
	{"quantity without quotes", gain("at = ¦1042 Hz\n"), []string{`write at = "1042 Hz"`}},
	{"glued quantity without quotes", gain("at = ¦1042Hz\n"), []string{`write at = "1042Hz"`}},
	{"decimal comma without quotes", gain("min = ¦39,5\n"), []string{"decimal comma|\"39.5 dB\""}},
	{"quantity with a comma, without quotes", gain("min = ¦39,5 dB\n"), []string{`write min = "39.5 dB"`}},
	{"word without quotes", gain("class = ¦major\n"), []string{`write class = "major"`}},
	{"path without quotes", base + "[takes.a]\nfile = ¦takes\\a.wav\n", []string{`write file = "takes/a.wav"`}},
	{"capital True", gain("optional = ¦True\n"), []string{"true or false"}},
	{"colon for =", base + "¦title: Preamp\n", []string{"expected key = value|title: Preamp"}},
	{"open text", gain("clause = \"4.2¦\n"), []string{"not closed"}},
	{"no value", gain("clause =¦\n"), []string{"where a value should stand"}},
	{"utf-16", "¦\xff\xfef\x00o\x00", []string{"UTF-16|UTF-8"}},
	{"zero bytes", "format = 1\n¦\x00\x00", []string{"zero bytes"}},
	{"not utf-8", "title = \"caf¦\xe9\"\n", []string{"not UTF-8"}},

	// all at once, in the order of the text; positions count characters
	{"many", "¦titel = \"x\"\n" + gain("¦att = \"1 kHz\"\nmin = ¦39.5\nmax = ¦\"40,5 dB\"\nclause = \"4.2\"\nclass = ¦\"mayor\"\n"),
		[]string{"`title`", "`at`", `"39.5 dB"`, `"40.5 dB"`, "`major`"}},
	{"many with a slip of syntax", gain("at = ¦1042 Hz\nmin = ¦39.5\n") + "[[checks]]\nname = ¦7\nmeasure = \"level\"\ntake = \"tone\"\n",
		[]string{`"1042 Hz"`, `"39.5 dB"`, `"7"`}},
	{"behind wide characters", gain("where = { \"Verstärkung\" = \"40 dB\", Quelle = ¦[] }\n"), []string{"text in quotes"}},
}

func TestFaults(t *testing.T) {
	if len(faulty) < 60 {
		t.Fatalf("only %d faulty jobs", len(faulty))
	}
	for _, c := range faulty {
		t.Run(c.name, func(t *testing.T) {
			text, places := unmark(c.text)
			if len(places) != len(c.parts) {
				t.Fatalf("the case has %d marks and %d messages", len(places), len(c.parts))
			}
			wantFaults(t, text, places, c.parts)
			// Windows line ends and a byte-order mark move nothing.
			if !strings.Contains(text, "\x00") {
				wantFaults(t, "\xef\xbb\xbf"+strings.ReplaceAll(text, "\n", "\r\n"), places, c.parts)
			}
		})
	}
}

func wantFaults(t *testing.T, text string, places, parts []string) {
	t.Helper()
	_, err := read(t, text, Options{Headers: fakeHeaders})
	var list Errors
	if !errors.As(err, &list) {
		t.Fatalf("got %v, want faults at %v", err, places)
	}
	if len(list) != len(places) {
		t.Fatalf("got %d faults, want %d:\n%v", len(list), len(places), list)
	}
	for i, e := range list {
		if got := fmt.Sprintf("%d:%d", e.Line, e.Col); got != places[i] {
			t.Errorf("fault %d stands at %s, want %s: %v", i, got, places[i], e)
		}
		for _, part := range strings.Split(parts[i], "|") {
			if !strings.Contains(e.Text, part) {
				t.Errorf("fault %d lacks %q: %v", i, part, e)
			}
		}
		line := e.Error()
		if !strings.HasPrefix(line, "job.toml:"+places[i]+": ") || strings.ContainsAny(line, "\n\r\x1b\x00") || len(line) > 1000 {
			t.Errorf("not one clean line: %q", line)
		}
	}
}

// A link that leads out of the folder is refused by name, one that stays
// inside is not; so is a link to a file that is not there yet.
func TestLinks(t *testing.T) {
	outside, dir := t.TempDir(), t.TempDir()
	for _, d := range []string{filepath.Join(outside, "far"), filepath.Join(dir, "takes")} {
		if err := os.MkdirAll(d, 0o755); err != nil {
			t.Fatal(err)
		}
	}
	for name, to := range map[string]string{
		"away": filepath.Join(outside, "far"), "gone": filepath.Join(outside, "nothing"), "near": "takes",
		"circle": "circle", "back": filepath.Join("..", filepath.Base(dir), "takes"),
	} {
		if err := os.Symlink(to, filepath.Join(dir, name)); err != nil {
			t.Skip("no links on this system: ", err)
		}
	}
	for _, c := range []struct {
		file string
		bad  bool
	}{
		{"takes/a.wav", false}, {"near/a.wav", false}, {"back/a.wav", false},
		{"away/a.wav", true}, {"away", true}, {"gone", true}, {"circle/a.wav", true},
		{strings.Repeat("deep/", 100) + "a.wav", false},
	} {
		path, why := confine(dir, c.file, false)
		if (why != "") != c.bad {
			t.Errorf("%.30s: %q, %q", c.file, path, why)
		}
		if _, why := confine(dir, c.file, true); why != "" {
			t.Errorf("%.30s with leave to go out: %q", c.file, why)
		}
	}
	if p, why := confine(dir, "/abs/x.wav", true); p != filepath.FromSlash("/abs/x.wav") || why != "" {
		t.Errorf("absolute with leave: %q, %q", p, why)
	}
}

// Load names a job file that is none.
func TestLoadRefuses(t *testing.T) {
	dir := t.TempDir()
	big := filepath.Join(dir, "big.toml")
	if err := os.WriteFile(big, make([]byte, mostBytes+1), 0o644); err != nil {
		t.Fatal(err)
	}
	for path, part := range map[string]string{dir: "folder", filepath.Join(dir, "no.toml"): "no such file", big: "larger than"} {
		if _, err := Load(path, Options{}); err == nil || !strings.Contains(err.Error(), part) || !strings.Contains(err.Error(), path) {
			t.Errorf("%s: %v, want %q", path, err, part)
		}
	}
}
