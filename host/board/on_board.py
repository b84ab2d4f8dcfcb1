"""What is sent to MicroPython's raw prompt: statements as text, and how their answers are read.

Everything sent stays small: the board compiles each statement in its own memory.
"""

import base64
from dataclasses import dataclass, field

from host.board.files import AT_TOP, DIGEST_DIGITS, OWN_MARKS, ROOMS, BoardFile

# Bytes of a file that go in one statement; in base64 they are a third more.
CHUNK = 1536
TEMPORARY = ".new"
HELD_MAIN = "/main.py" + TEMPORARY
# As MicroPython numbers them in sys.implementation._mpy.
_ARCHITECTURES = (
    "", "x86", "x64", "armv6", "armv6m", "armv7m", "armv7em", "armv7emsp", "armv7emdp", "xtensa", "xtensawin",
    "rv32imc", "rv64imc",
)  # fmt: skip

_TOP_NAMES = (*AT_TOP, *(path + TEMPORARY for path in AT_TOP))

SURVEY = f"""\
import os,sys,hashlib,binascii
def cw_sum(p,mark=b''):
 h=hashlib.sha256();b=bytearray(2048);m=memoryview(b);own=0
 with open(p,'rb') as f:
  while 1:
   n=f.readinto(b)
   if not n:break
   h.update(m[:n])
   if mark and mark in bytes(m[:n]):own=1
 return binascii.hexlify(h.digest()).decode()[:{DIGEST_DIGITS}],own
def cw_file(p,mark=b''):
 s,own=cw_sum(p,mark)
 print('f',os.stat(p)[6],s,own,p)
def cw_walk(d):
 try:names=sorted((e[0],e[1]) for e in os.ilistdir(d))
 except OSError:return
 print('d',d)
 for n,t in names:
  if t&0x4000:cw_walk(d+'/'+n)
  else:cw_file(d+'/'+n)
def cw_survey():
 i=sys.implementation
 print('v',i.name,i.version[0],i.version[1],i.version[2],getattr(i,'_mpy',0))
 print('m',getattr(i,'_machine',sys.platform))
 s=os.statvfs('/')
 print('s',s[1] or s[0],s[3])
 marks={OWN_MARKS!r}
 for p in {_TOP_NAMES!r}:
  try:os.stat(p)
  except OSError:continue
  cw_file(p,marks.get(p,b''))
 for d in {tuple("/" + room for room in ROOMS)!r}:cw_walk(d)
cw_survey()
"""

HELPERS = """\
def cw_there(p):
 try:os.stat(p)
 except OSError:return False
 return True
def cw_open(p):
 global cw_f
 cw_f=open(p,'wb')
def cw_w(t):cw_f.write(binascii.a2b_base64(t))
def cw_done(p,want):
 cw_f.close()
 s=cw_sum(p+'.new')[0]
 if s==want:os.rename(p+'.new',p)
 print(s)
def cw_drop(p):
 try:cw_f.close()
 except Exception:pass
 if cw_there(p):os.remove(p)
def cw_aside(p):
 n=1
 while cw_there('%s.owner%s'%(p,n if n>1 else '')):n+=1
 os.rename(p,'%s.owner%s'%(p,n if n>1 else ''))
def cw_dirs(names):
 for d in names:
  if not cw_there(d):os.mkdir(d)
def cw_rm(names):
 for p in names:
  if cw_there(p):os.remove(p)
def cw_rmdirs(names):
 for d in names:
  try:os.rmdir(d)
  except OSError:pass
"""

RESTART = "import machine\nmachine.reset()"


@dataclass
class Survey:
    """What is on a board. files: path to digest; sizes: in bytes; own: files at the top that are of this firmware.

    mpy: (major, minor) of compiled files that it takes; block: bytes of a flash block, blocks_free of them are free.
    """

    name: str = ""
    version: tuple[int, int, int] = (0, 0, 0)
    machine: str = ""
    mpy: tuple[int, int] = (0, 0)
    architecture: str = ""
    block: int = 1
    blocks_free: int = 0
    files: dict[str, str] = field(default_factory=dict)
    sizes: dict[str, int] = field(default_factory=dict)
    own: set[str] = field(default_factory=set)
    folders: list[str] = field(default_factory=list)


def read_survey(text: str) -> Survey:
    """The answer to SURVEY. Raises ValueError if it is not one."""
    survey = Survey()
    for line in text.splitlines():
        kind, _, rest = line.strip().partition(" ")
        if kind == "v":
            survey.name, *numbers = rest.split()
            major, minor, patch, mpy = (int(number) for number in numbers)
            survey.version = (major, minor, patch)
            survey.mpy = (mpy & 0xFF, mpy >> 8 & 3)
            place = mpy >> 10 & 15
            survey.architecture = _ARCHITECTURES[place] if place < len(_ARCHITECTURES) else ""
        elif kind == "m":
            survey.machine = rest
        elif kind == "s":
            block, survey.blocks_free = (int(number) for number in rest.split())
            survey.block = max(1, block)
        elif kind == "d":
            survey.folders.append(rest)
        elif kind == "f":
            size, digest, own, path = rest.split(" ", 3)
            survey.files[path], survey.sizes[path] = digest, int(size)
            if own == "1":
                survey.own.add(path)
    if not survey.name:
        raise ValueError(text)
    return survey


def copying(file: BoardFile) -> list[str]:
    """The statements that put one file on the board; the last prints the digest of what lies there."""
    new = file.path + TEMPORARY
    chunks = [file.data[at : at + CHUNK] for at in range(0, len(file.data), CHUNK)] or [b""]
    statements = [f"cw_w({base64.b64encode(chunk)!r})" for chunk in chunks]
    statements[0] = f"cw_open({new!r});{statements[0]}"
    statements[-1] += f";cw_done({file.path!r},{file.digest!r})"
    return statements
