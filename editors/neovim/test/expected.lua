-- Written by expected.py; the lowest gap in meV before and after the edit.
return { before = 127.3371, after = 82.8358, within = 0.06 }
