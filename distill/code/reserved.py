"""Names that no argument may have: words of the languages, and what the exported files define.

One list for all languages, so that an agent is called the same in each. In lower case.
"""

from __future__ import annotations

_WORDS = """
abstract alignas alignof and any arguments as asm assert async atomic auto await bool boolean
break byte case catch char class complex const constexpr continue debugger def default del delete
do double elif else enum errno eval except exec export extends extern f false final finally float
for from function generic global goto i if imaginary implements import in inf infinity inherits
inline instanceof int interface is isfinite isinf isnan lambda let linux long match na nan native
new next none nonlocal noreturn not null nullptr of or package pass print private protected public
raise register repeat restrict return short signed signbit sizeof static stderr stdin stdout
struct super switch synchronized t tally this thread_local throw throws transient true try type
typedef typeof typeof_unqual undefined union unix unsigned using value values var void volatile
wchar_t while with yield
"""

_OURS = """
answer belief decide main minus_at never plus_at prior process row rows tie worth wrong
check_decide check_value
"""

RESERVED = frozenset((_WORDS + _OURS).split())
"""What :func:`thumbwright.distill.code.inputs.parts_of` avoids, whatever the case of letters."""
