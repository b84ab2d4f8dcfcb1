"""A good layout of two boards, and everything that can be wrong about boards."""

# ruff: noqa: E501  (a table: a row a line)

from tests.layout.files import Case, Expected

TWO = """\
[layout]
name = "Two Test"

[supply]
volts = 16.0

[[board]]
name = "Up"
uid = "E6614103E7"
address = 1

[board.inputs]
"contact" = "pin 20"
"shared" = "pin 21"

[board.outputs]
"lamp" = "pin 22"

[[board]]
name = "Down"
address = 2

[board.io]
input_pins = [20]

[board.inputs]
"key" = 0
"shared" = "pin 21"

[[bank]]
name = "U"
board = "Up"
first_pin = 0
coils = 6
adc = 0
resistor_w = 10

[[bank]]
name = "D"
board = "Down"
first_pin = 0
coils = 6
adc = 0
resistor_w = 10

[[bank]]
name = "D2"
board = "Down"
first_pin = 6
coils = 2
adc = 1
resistor_w = 10

[[junction]]
name = "One"
bank = "D"
reverse = "loop"
not_while = "key"
motors = [{ coils = [0, 1] }]

[[junction]]
name = "Two"
bank = "U"
motors = [{ coils = [0, 1], contact_inputs = ["contact"] }]

[[junction]]
name = "Pair"
kind = "crossover"
bank = "D"
motors = [{ coils = [2, 3] }, { coils = [4, 5] }]

[[route]]
name = "Down all"
throws = ["One: loop", "Pair: reverse"]

[[route]]
name = "Across"
throws = ["Two: reverse", "One: loop", "3: normal"]

[[button]]
kind = "alternate"
input = "shared"
board = "Down"
junction = "One"

[[follower]]
kind = "lamp"
output = "lamp"
junction = "Two"
lie = "normal"
"""


def two(name: str, old: str, new: str, *expected: tuple[str | int, str, str]) -> Case:
    """TWO with one thing changed."""
    if TWO.count(old) != 1:
        raise ValueError(f"{name}: {old!r} must stand once in the good layout")
    return Case(name, "", TWO.replace(old, new), tuple(Expected(*each) for each in expected))


UP = 'name = "Up"'
BOARDS = (
    # ---- the boards themselves
    two("board without a name", UP + "\n", "", (7, "board 1.name", "is missing")),
    two("two boards of a name", 'name = "Down"', 'name = "Up" #1', ("#1", "board 2.name", "another board is called 'Up'"),
        (40, "bank 2.board", "there is no board 'Down'"), (48, "bank 3.board", "there is no board 'Down'"),
        (83, "button 1.board", "there is no board 'Down'")),
    two("two boards of an id", 'name = "Down"', 'name = "Down"\nuid = "E6614103E7" #1', ("#1", "board 2.uid", "board 'Up' has the same uid")),
    two("two boards of an address", "address = 2", "address = 1 #1", ("#1", "board 2.address", "board 'Up' has the same address")),
    two("address beyond the links", "address = 2", "address = 4 #1", ("#1", "board 2.address", "4 is outside 0 to 3")),
    two("unknown key of a board", "address = 2", "adress = 2 #1", ("#1", "board 2.adress", "did you mean 'address'")),
    two("id that is a number", 'uid = "E6614103E7"', "uid = 66 #1", ("#1", "board 1.uid", "must be text in quotes")),
    two("pins of no board", "[[bank]]\nname = \"U\"", "[io]\ninput_pins = [3]\n\n[[bank]]\nname = \"U\"",
        (30, "io", r"is a board's own here: write \[board.io\] below its \[\[board\]\]")),
    two("inputs of no board", "[[bank]]\nname = \"U\"", "[inputs]\n\"x\" = 3\n\n[[bank]]\nname = \"U\"", (30, "inputs", "is a board's own here")),
    two("pin used twice on a board", 'first_pin = 6', 'first_pin = 20 #1', ("#1", "bank 3.first_pin", "pin 20 has a use already: input 0 'key'")),
    two("board with nothing on it", "[[bank]]\nname = \"U\"", "[[board]] #1\nname = \"Idle\"\n\n[[bank]]\nname = \"U\"",
        ("#1", "board 3", "no bank is on board 'Idle'")),
    # ---- banks
    two("bank on no board", 'name = "U"\nboard = "Up"', 'name = "U" #1', (30, "bank 1.board", "is missing: the boards are Up, Down")),
    two("bank on an unknown board", 'name = "U"\nboard = "Up"', 'name = "U"\nboard = "Upp" #1', ("#1", "bank 1.board", "there is no board 'Upp'; did you mean 'Up'")),
    two("bank's board of the wrong kind", 'name = "U"\nboard = "Up"', 'name = "U"\nboard = [1] #1', ("#1", "bank 1.board", "must be text in quotes")),
    two("two banks of a name on one board", 'name = "D2"', 'name = "D" #1', ("#1", "bank 3.name", "another bank is called 'D'")),
    two("adc used twice on a board", "adc = 1", "adc = 0 #1", ("#1", "bank 3.adc", "pin 26 has a use already: voltage sense of bank 'D'")),
    # ---- junctions: all motors on one board
    two("motors on two boards", "{ coils = [4, 5] }", '{ bank = "U", coils = [4, 5] }',
        (70, "junction 3.motors 2.bank", "is on board 'Up', the junction's bank on board 'Down': all motors of a junction are on banks of one board")),
    two("junction on no bank", 'bank = "U"\n', 'bank = "V" #1\n', ("#1", "junction 2.bank", "there is no bank 'V'; there are: U, D, D2")),
    two("contact on another board", 'contact_inputs = ["contact"]', 'contact_inputs = ["key"]',
        (64, "junction 2.motors 1.contact_inputs 1", "input 'key' is on board 'Down': each board has its own")),
    two("key on another board", 'not_while = "key"', 'not_while = "contact" #1', ("#1", "junction 1.not_while", "input 'contact' is on board 'Up'")),
    two("no such input anywhere", 'not_while = "key"', 'not_while = "kee" #1', ("#1", "junction 1.not_while", "there is no input named 'kee'; did you mean 'key'")),
    # ---- routes
    two("route to no junction", '"One: loop", "Pair: reverse"', '\n"One: loop", "Bear: reverse", #1\n',
        ("#1", "route 1.throws 2", "there is no junction 'Bear'; there are: One, Two, Pair")),
    two("route over both to no lie", '"Two: reverse", "One: loop"', '\n"Two: up", #1\n"One: loop"',
        ("#1", "route 2.throws 1", "there is no lie of 'Two' 'up'; there are: normal, reverse")),
    two("route over both throws twice", '"3: normal"', '\n"One: normal", #1\n', ("#1", "route 2.throws 3", "the route throws 'One' twice")),
    two("route over both with an entrance", 'name = "Across"', 'name = "Across"\nentrance = 1 #1\nexit = 2',
        ("#1", "route 2.entrance", "a route over several boards is run by the host"), (79, "route 2.exit", "no button can set it")),
    two("unknown key of a route over both", 'name = "Across"', 'name = "Across"\nlength = 1 #1', ("#1", "route 2.length", "is not a key here")),
    two("two routes of a name", 'name = "Across"', 'name = "Down all" #1', ("#1", "route 2.name", "another route is called 'Down all'")),
    # ---- buttons and followers
    two("button for another board's junction", 'junction = "One"', 'junction = "Two" #1',
        ("#1", "button 1.junction", "is on board 'Up', the button on board 'Down': it works without a host, so it throws only what its own board has")),
    two("button for a route over both", 'kind = "alternate"\ninput = "shared"\nboard = "Down"\njunction = "One"', 'kind = "route"\ninput = "shared"\nboard = "Down"\nroute = "Across" #1',
        ("#1", "button 1.route", "goes over several boards: a button works without a host, so it can't set it")),
    two("button for another board's route", 'kind = "alternate"\ninput = "shared"\nboard = "Down"\njunction = "One"', 'kind = "route"\ninput = "shared"\nboard = "Up"\nroute = "Down all" #1',
        ("#1", "button 1.route", "is on board 'Down', the button on board 'Up'")),
    two("button whose input two boards have", 'board = "Down"\njunction', "junction", (80, "button 1.board", "is missing: board 'Up' and board 'Down' have an input 'shared'")),
    two("button by number of its input", 'input = "shared"\nboard = "Down"\n', "input = 1\n", (80, "button 1.board", "is missing: the number of an input does not tell its board")),
    two("button on no input", 'input = "shared"\nboard = "Down"\n', 'input = "contakt" #1\n', ("#1", "button 1.input", "there is no input named 'contakt'; did you mean 'contact'")),
    two("button on another board's input", 'input = "shared"\nboard = "Down"', 'input = "contact" #1\nboard = "Down"', ("#1", "button 1.input", "input 'contact' is on board 'Up'")),
    two("button for no junction", 'junction = "One"', 'junction = "Wan" #1', ("#1", "button 1.junction", "there is no junction 'Wan'")),
    two("lamp for another board's junction", 'output = "lamp"\njunction = "Two"', 'output = "lamp"\njunction = "Pair" #1',
        ("#1", "follower 1.junction", "is on board 'Down', the follower on board 'Up': it works without a host, so it follows only")),
    two("lamp on no output", 'output = "lamp"', 'output = "bulb" #1', ("#1", "follower 1.output", "there is no output named 'bulb'; there are: lamp")),
    # ---- what a board's own check finds
    two("ready voltage never reached", 'name = "Pair"', 'name = "Pair"\nready_v = 17 #1', ("#1", "junction 3.ready_v", "17 V is never reached: bank 'D' is full")),
    two("not a list of boards", "[[bank]]\nname = \"U\"", "[[timing]]\n\n[[bank]]\nname = \"U\"", (30, "timing", "must be a table")),
)  # fmt: skip
