package scopecsv

import "strings"

// The words by which settings and columns are recognised, in lower case and
// parted by bars. They are trade words in the languages met; no maker's word
// decides anything, since units, places and numbers weigh more.

// settingNames are the names of settings in plain form, by kind.
var settingNames = map[settingKind]string{
	intervalSetting: "sample interval|sampling interval|time interval|interval|increment|x increment|xincrement|x incr|" +
		"xincr|x inc|xinc|time increment|horizontal interval|horizontal increment|horz interval|hor interval|" +
		"delta x|deltax|delta t|deltat|delta time|time delta|dt|d t|dx|t delta|tdelta|\u03b4t|\u0394t|" +
		"sample period|sampling period|sample spacing|time step|timestep|x step|time per sample|" +
		"time resolution|x resolution|logging interval|log interval|recording interval|record interval|" +
		"scan interval|scan period|acquisition interval|point interval|time between samples|abtastintervall|" +
		"intervall|intervalle|intervalo|waveform delta|wf increment|horiz interval|sampinterval|" +
		"sample time interval|period per sample|xunit per point|seconds per sample|sec per sample|" +
		"s per sample|time inc|x delta|xdelta|clock|h resolution|hresolution|horizontal resolution|t inc|" +
		"tinc|x axis increment|xaxis increment",
	rateSetting: "sample rate|sampling rate|samplerate|samplingrate|sampling frequency|sample frequency|" +
		"samplingfrequency|fs|sr|rate|scan rate|acquisition rate|sampling speed|sample speed|sample clock|" +
		"sampling|update rate|samples per second|samples s|sps|sa s|s s|logging rate|data rate|abtastrate|" +
		"abtastfrequenz|samp rate|sampl rate|daq rate|adc rate|sample rate hz|actual sample rate|" +
		"points per second|acq rate|fr\u00e9quence d'\u00e9chantillonnage|frecuencia de muestreo|" +
		"sampling freq|sample freq|f sample|f s",
	startSetting: "h offset|hoffset|start|x0|x 0|xzero|x zero|x origin|xorigin|x start|start x|t0|time zero|" +
		"first sample|time of first sample|first point|start offset|x offset|xoffset|x first|xstart|" +
		"time start|start time|horizontal start",
	lengthSetting: "record length|recordlength|points|samples|number of points|number of samples|sample count|" +
		"samples count|num samples|num points|no of samples|no of points|data points|numsamples|n samples|" +
		"npoints|n points|nr pt|nr of points|record size|waveform length|waveform points|data length|" +
		"datalength|samples per channel|points per channel|memory length|total samples|total points|" +
		"segment size|point count|sample number|sample points|sampling points|block size|blocksize|" +
		"data count|sample length|number of data|number of rows|rows|anzahl|wfm points|pts|" +
		"number of readings|x size|size|number of records|total records",
	scaleSetting: "volts per count|volt per count|v per count|v count|volts count|volts per lsb|v lsb|volt per lsb|" +
		"v per lsb|lsb|lsb size|lsb value|volts per code|volts per bit|v bit|v per bit|scale v count|" +
		"counts to volts|volts per adc count|v per adc count|y mult|ymult|y increment|yincrement|yinc|y inc|" +
		"v per code|mv per count|count size",
	offsetSetting: "y off|yoff|y zero|yzero|y origin|yorigin|yreference|y reference|yref|count offset|zero count|" +
		"offset counts|code offset|midscale|mid scale|adc offset|zero code|y offset|yoffset",
	timeUnitSetting: "h unit|hunit|horizontal units|horizontal unit|time units|time unit|x units|x unit|xunit|xunits|" +
		"x unit label|x axis unit|horz units|time base unit|timebase unit|x axis units|time axis unit",
	valueUnitSetting: "v unit|vunit|vertical units|vertical unit|y units|y unit|yunit|yunits|units|unit|y unit label|" +
		"y axis unit|value unit|value units|voltage unit|voltage units|vert units|data unit|y axis units|" +
		"einheit|unit y|channel units",
	probeSetting: "probe attenuation|probe|attenuation|probe factor|probe ratio|probe atten|attn",
	modeSetting: "acquisition mode|acq mode|acquire mode|sampling mode|sample mode|acquisition type|acquisition|" +
		"acquire|mode|acquire type",
	otherSetting: "source|model|firmware|firmware version|serial|serial number|vertical scale|vertical offset|" +
		"horizontal scale|horizontal offset|trigger|trigger level|coupling|note|bandwidth|trigger point|" +
		"trigger time|y scale|x scale|scale|offset|position|time base|trigger mode|trigger source|" +
		"persistence|title|operator|version|waveform type|instrument|file",
}

// timeWords are names of a time column in the languages met, in lower case.
var timeWords = set("time|t|times|zeit|temps|tiempo|tempo|tid|tijd|aika|czas|\u0432\u0440\u0435\u043c\u044f|\u65f6\u95f4|" +
	"\u6642\u9593|\u6642\u523b|\uc2dc\uac04|zeitachse|timestamp|time stamp|timebase|elapsed|elapsed time|" +
	"seconds|second|sec|secs|rel time|relative time|reltime|abs time|date time|datetime|date/time|date|" +
	"clock|s|ms|us|ns|milliseconds|microseconds|millis|micros|cas|\u010das|zaman|vrijeme|sample time|" +
	"horizontal|in s|uhrzeit|heure|hora|ora")

// indexWords are names of a column that counts rows, in lower case.
var indexWords = set("x|index|idx|i|n|no|no.|nr|nr.|#|sample|samples|sample no|sample no.|sample number|sample #|" +
	"sample index|point|points|number|num|row|rows|sequence|seq|record|record no|record no.|scan|scan no|" +
	"reading|reading no|counter|id|item|\u5e8f\u53f7|s/n|entry|pos|position|line|sample_index|sample_no|" +
	"pts|data point")

// extraWords name columns that are no channel even when they hold numbers.
var extraWords = set("event|events|marker|markers|comment|comments|signature|alarm|alarms|alarm text|status|flag|flags|" +
	"checksum|crc|annotation|annotations|note|notes|remark|remarks|date|valid|trigger event|error|errors|" +
	"state")

// settingWords is settingNames turned round.
var settingWords = func() map[string]settingKind {
	m := map[string]settingKind{}
	for kind, names := range settingNames {
		for _, n := range strings.Split(names, "|") {
			m[n] = kind
		}
	}
	return m
}()

func set(words string) map[string]bool {
	m := map[string]bool{}
	for _, w := range strings.Split(words, "|") {
		m[w] = true
	}
	return m
}
