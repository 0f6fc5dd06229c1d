# Relocation from nuclei: four fields of the sample dish, half their nuclei lost, the others moved by 3 um.
# The figures depend on what the segmentation finds, so they are compared with the truth, not printed.
mkdir f o
/usr/bin/python3 "$TESTS/tools/make_fields.py" "$SAMPLES" f
/usr/bin/python3 "$TESTS/tools/make_fields.py" "$SAMPLES" o --others
quietly aimwell start dish.dish --scan "$SAMPLES/scan.csv" --who ada
echo "--- before there are nuclei"
run aimwell calibrate dish.dish fields f/fields.csv --who ada
quietly aimwell segment dish.dish --who ada
aimwell calibrate dish.dish fields f/fields.csv --who ada --figure fields.svg --map error.png >said
grep '^Camera' said
python3 - <<'END'
import re
text = open('said').read()
def near(name, pattern, truth, tolerance):
    value = float(re.search(pattern, text).group(1))
    print(name, 'as in truth' if abs(value - truth) <= tolerance else f'{value}, truth {truth}')
near('scale', r'scale ([\d.]+)', 1.004, 0.001)
near('rotation', r'rotation ([\d.-]+)', 12.3, 0.06)
near('movement', r'Movement +([\d.]+)', 3, 0.6)
near('chance', r'10\^(-\d+) times', -50, 30)
END
grep -o 'in 2.00 h; as a random walk' said
aimwell journal dish.dish | grep -o 'calibrated the relocation from [0-9]* nuclei in 4 fields' | sed 's/from [0-9]*/from N/'
aimwell calibrate dish.dish --show | grep -o 'relocation fitted: similarity'
ls fields.svg error.png
quietly aimwell undo dish.dish --who ada
echo "--- the camera's map entered, rightly and wrongly"
aimwell calibrate dish.dish fields f/fields.csv --pixel-map 0.65,0,0,-0.65 --fit affine --who ada | grep -E '^Camera|affine' | sed 's/from [0-9]*/from N/'
quietly aimwell undo dish.dish --who ada
aimwell journal dish.dish >before
run aimwell calibrate dish.dish fields f/fields.csv --pixel-map 0.65,0,0,0.65 --who ada | sed 's/(10^[0-9]* expected)/(10^N expected)/; s/field-[0-9]/field-N/'
run aimwell calibrate dish.dish fields f/fields.csv --pixel-map 0.65,0,0 --who ada
run aimwell calibrate dish.dish fields f/fields.csv --pixel-map 1,2,2,4 --who ada
echo "--- another dish"
run aimwell calibrate dish.dish fields o/fields.csv --who ada | sed 's/(10^[0-9]* expected)/(10^N expected)/'
echo "--- tables that cannot do"
head -2 f/fields.csv >f/one.csv
cut -d, -f1-3 f/fields.csv >f/plain.csv
sed '3s/,0.65,/,0.5,/' f/fields.csv >f/two.csv
run aimwell calibrate dish.dish fields f/one.csv --who ada
run aimwell calibrate dish.dish fields f/plain.csv --who ada
run aimwell calibrate dish.dish fields f/two.csv --who ada
aimwell journal dish.dish | cmp - before && echo "the record is as it was"
