"""Layout files whose tables, keys or values are wrong."""

# ruff: noqa: E501  (a table: a row a line)

from tests.layout.files import case

JUNCTION = '[[junction]]\nname = "Single"'

TABLES = (
    # ---- the text as TOML
    case("empty", "", "#", (1, "layout", "is missing"), (1, "supply", "is missing"), (1, "bank", "is missing"),
         (1, "junction", "is missing")),
    case("no closing bracket", "[supply]", "[supply #1", ("#1", "file", "is not TOML")),
    case("no value", "volts = 16.0", "volts = #1", ("#1", "file", "is not TOML: invalid value")),
    case("key twice", "volts = 16.0", "volts = 16.0\nvolts = 12.0 #1", ("#1", "file", "is not TOML: cannot overwrite")),
    case("table twice", "[outputs]", "[supply] #1\n[outputs]", ("#1", "file", "is not TOML: cannot declare")),
    case("open string", 'name = "Saltmarsh Test"', 'name = "Saltmarsh Test', (2, "file", "is not TOML")),
    case("tab in a name", "name = \"Single\"", 'name = "Sin\\tgle" #1', ("#1", "junction 1.name", "control characters")),
    case("escape in a name", "name = \"Single\"", 'name = "\\u001b[2J" #1', ("#1", "junction 1.name", "control char")),
    case("infinite", "volts = 16.0", "volts = inf #1", ("#1", "supply.volts", "must be a finite number")),
    case("not a number", "volts = 16.0", "volts = nan #1", ("#1", "supply.volts", "must be a finite number")),
    case("huge float", "volts = 16.0", "volts = 1e999 #1", ("#1", "supply.volts", "must be a finite number")),
    case("huge hexadecimal", "coils = 6", f"coils = 0x{'f' * 6000} #1", ("#1", "bank 1.coils", "a huge number is out")),
    case("huge decimal", "coils = 6", f"coils = {'9' * 6000} #1", ("#1", "file", "holds a huge number")),
    case("date for a name", "name = \"Single\"", "name = 2020-02-03 #1", ("#1", "junction 1.name", "must be text")),
    # ---- unknown, missing, mistyped
    case("unknown table", "[outputs]", "[lamps] #1\n[outputs]", ("#1", "lamps", "is not a key here")),
    case("unknown key, near one", "guard = \"ptc\"", 'gaurd = "ptc" #1', ("#1", "bank 2.gaurd", "did you mean 'guard'")),
    case("unknown key, unit missing", "resistor_w = 10", "resistor = 10 #1",
         ("#1", "bank 1.resistor", "did you mean 'resistor_w'")),
    case("unknown key, near none", "adc = 1", "adc = 1\nzzz = 1 #1", ("#1", "bank 2.zzz", "keys: name, first_pin")),
    case("unknown key in an inline table", "{ coils = [2, 3] }", "{ coils = [2, 3], ohms = 4 }", (49, "junction 2.motors "
         "2.ohms", "did you mean 'ohm'")),
    case("dotted key of no table", "[layout]", "layout.title = 'x' #1\n[layout2]", ("#1", "layout.name", "is missing"),
         ("#1", "layout.title", "is not a key here"), (2, "layout2", "did you mean 'layout'")),
    case("no name", "name = \"Single\"", "#1", (38, "junction 1.name", "is missing")),
    case("no supply voltage", "[supply]\nvolts = 16.0", "[supply] #1", ("#1", "supply.volts", "is missing")),
    case("no motors", "motors = [{ coils = [0, 1] }, { coils = [2, 3] }]", "", (45, "junction 2.motors", "is missing")),
    case("no coils", "{ coils = [2, 3] }", "{ }", (49, "junction 2.motors 2.coils", "is missing")),
    case("number as text", "volts = 16.0", 'volts = "16" #1', ("#1", "supply.volts", "must be a number of V, without qu")),
    case("value with unit", "resistor_w = 10", 'resistor_w = "10 W" #1', ("#1", "bank 1.resistor_w", "without quotes or")),
    case("yes for true", "name = \"Cross\"", 'name = "Cross"\ntogether = "yes" #1',
         ("#1", "junction 2.together", "must be true or false")),
    case("true for a number", "coils = 6", "coils = true #1", ("#1", "bank 1.coils", "must be a whole number")),
    case("fraction of a coil", "coils = 6", "coils = 6.5 #1", ("#1", "bank 1.coils", "must be a whole number")),
    case("one bank as a table", "[[bank]]\nname = \"Pins\"", "[bank] #1\nname = \"Pins\"", (31, "file", "is not TOML")),
    case("table for a list", "[[route]]", "[route] #1", ("#1", "route", r"must be a list of tables: \[\[route\]\]")),
    case("value for a table", "", "layout = 3 #1\nsupply = {volts = 12}\nbank = []\njunction = []\n",
         ("#1", "layout", r"must be a table: write \[layout\]"), (3, "bank", "has 0 entries: at least 1"),
         (4, "junction", "has 0 entries: at least 1")),
    case("number in a list of tables", "motors = [{ coils = [4, 5] }, { coils = [6, 7] }]", "motors = [4, 5] #1",
         ("#1", "junction 3.motors 1", "must be a table"), ("#1", "junction 3.motors 2", "must be a table")),
    case("text in a list of numbers", "first_pin = 0", 'chain_pins = ["0", 1] #1',
         ("#1", "bank 1.chain_pins", "must hold whole numbers")),
    case("unknown word", 'guard = "ptc"', 'guard = "hope" #1', ("#1", "bank 2.guard", "must be one of: none, cutoff, p")),
    case("empty name", "name = \"Single\"", 'name = "" #1', ("#1", "junction 1.name", "must not be empty")),
    # ---- out of range
    case("supply too high", "volts = 16.0", "volts = 48 #1", ("#1", "supply.volts", "48 is outside 9 to 30 V")),
    case("pulse too long", "name = \"Single\"", 'name = "Single"\npulse_ms = 66 #1',
         ("#1", "junction 1.pulse_ms", "66 is outside 5 to 65 ms")),
    case("negative rest", "coils = [0, 1], contact", "rest_ms = -1, coils = [0, 1], contact",
         (43, "junction 1.motors 1.rest_ms", "-1 is outside 200 to 10 000 ms")),
    case("fourth ADC input", "adc = 1", "adc = 3 #1", ("#1", "bank 2.adc", "3 is outside 0 to 2")),
    case("capacitance in farad", "adc = 1", "adc = 1\ncapacitance_uf = 0 #1", ("#1", "bank 2.capacitance_uf", "0 is outs")),
    case("three coils", "{ coils = [2, 3] }", "{ coils = [2, 3, 8] }", (49, "junction 2.motors 2.coils", "at most 2")),
    case("one lie", '[[junction.lie]]\nname = "left"\nmotors = ["reverse", "normal"]\n\n[[junction.lie]]\nname = "right"\n'
         'motors = ["normal", "reverse"]\n', "", (58, "junction 3.lie", "has 1 entries: at least 2")),
    # ---- huge
    case("long name", "name = \"Single\"", f'name = "{"S" * 25}" #1', ("#1", "junction 1.name", "has 25 characters: at mo")),
    case("very long name", "name = \"Single\"", f'name = "{"S" * 900_000}" #1',
         ("#1", "junction 1.name", "has 900000 characters: at most 24")),
    case("very long key", "adc = 1", f"adc = 1\n{'k' * 900_000} = 1 #1", ("#1", "bank 2." + "k" * 37 + "...", "is not a k")),
    case("long word of a lie", 'reverse = "loop"', f'reverse = "{"loop " * 9}" #1',
         ("#1", "junction 1.reverse", "has 45 characters: at most 24")),
    case("17 throws", 'throws = ["Single: main", "Fan: middle"]', f"throws = {['Single: main'] * 17} #1",
         ("#1", "route 1.throws", "has 17 entries: at most 16")),
    case("500 routes", "[[route]]", "[[route]]\n" * 500, (70, "route", "has 500 entries: at most 32")),
    case("deep list", "volts = 16.0", f"volts = {'[' * 100}{']' * 100} #1", (4, "supply", "is nested too deeply")),
    case("very deep list", "volts = 16.0", f"volts = {'[' * 9000}{']' * 9000} #1", ("#1", "file", "is nested too deeply")),
    case("endless key", "[outputs]", f"{'a.' * 400_000}b = 1 #1\n[outputs]", ("#1", "file", "is nested too deeply")),
    case("endless quoted key", "adc = 1", 'adc = 1\nx = { ' + '"a" . ' * 90_000 + 'b = 1 } #1', ("#1", "file", "is nested too")),
    case("deep table", "[outputs]", f"[outputs.{'.'.join('a' * 40)}] #1\n[outputs]", (22, "outputs", "is nested too deep")),
)  # fmt: skip
