# SPDX-License-Identifier: GPL-3.0-or-later
"""A panel's answers come back as they were written, in whatever way a table may
be written.

Random answers of a few people in two conditions are written trial by trial and
as counts that are split over rows, with any separator, decimal mark, line end,
order of rows and columns, in the task's words or as 1 and 0, with columns that
nobody knows, comments and quotes. The counts that `panel fit` and `panel next`
then hold must be those that were drawn, and every way of writing must give the
same curves. One spoilt field is refused with its line and name.

usage: answers_law.py EVENFIELD; prints TAP.
"""
import json
import os
import random
import subprocess
import sys
import tempfile

WORDS = {'yes-no': ('yes', 'no'), '2ifc': ('right', 'wrong'),
         'same-different': ('different', 'same'),
         'triangle': ('correct', 'incorrect'),
         'greater-less': ('greater', 'less')}
NAMES = ['anna', 'b, the second', 'o"3', '\u00e9mile', 'p 05']
CONDITIONS = ['deck', 'cabin']
ROUNDS = 10

random.seed(20261201)
number = 0
failed = 0


def check(name, is_good, why=''):
    global number, failed
    number += 1
    failed += not is_good
    print('%sok %d - %s' % ('' if is_good else 'not ', number, name))
    if not is_good:
        print('#   ' + str(why).replace('\n', '\n#   '))


def quoted(text, separator, always=False):
    if always or any(c in text for c in separator + '"\n'):
        return '"' + text.replace('"', '""') + '"'
    return text


def draw(task):
    """{(observer, condition, level): [n, k]} with answers that rise."""
    signs = (-1, 1) if task == 'greater-less' else (1,)
    sizes = [round(random.uniform(0.2, 4.0), random.choice([1, 2, 3]))
             for _ in range(random.randint(4, 6))]
    levels = sorted({s * size for s in signs for size in sizes})
    counts = {}
    for who in random.sample(NAMES, random.randint(1, len(NAMES))):
        for condition in CONDITIONS:
            for i, level in enumerate(levels):
                n = random.randint(3, 30)
                share = 0.1 + 0.85 * i / (len(levels) - 1)
                k = sum(random.random() < share for _ in range(n))
                counts[who, condition, level] = [n, k]
    return counts


def as_trials(counts, task):
    yes, no = random.choice([WORDS[task], ('1', '0')])
    rows = []
    for (who, condition, level), (n, k) in counts.items():
        answers = [yes] * k + [no] * (n - k)
        rows += [(who, condition, level, (a,)) for a in answers]
    random.shuffle(rows)
    return ['answer'], rows


def as_counts(counts):
    rows = []
    for (who, condition, level), (n, k) in counts.items():
        split = random.randint(0, n - 1)
        first_k = random.randint(max(0, k - (n - split)), min(k, split))
        for part in ((split, first_k), (n - split, k - first_k)):
            if part[0] > 0:
                rows.append((who, condition, level, tuple(map(str, part))))
    random.shuffle(rows)
    return ['n', 'k'], rows


def write(path, kind, task):
    """Writes a table and returns how, and on which lines its rows stand."""
    names, rows = kind
    separator = random.choice([',', ';', '\t'])
    mark = ',' if separator == ';' and random.random() < 0.7 else '.'
    end = random.choice(['\n', '\r\n'])
    columns = ['observer', 'condition', 'level'] + names
    if random.random() < 0.5:
        columns.append('task')
    if random.random() < 0.5:
        columns.append('room temperature')
    random.shuffle(columns)
    lines = ['# unit: mm'] if random.random() < 0.5 else []
    lines.append(separator.join(quoted(c, separator) for c in columns))
    where = []
    for who, condition, level, answer in rows:
        text = repr(level).replace('.', mark)
        if random.random() < 0.2:
            text = ('%.6e' % level).replace('.', mark)
        value = {'observer': who, 'condition': condition, 'level': text,
                 'task': task, 'room temperature': '21'}
        value.update(zip(names, answer))
        lines.append(separator.join(
            quoted(value[c], separator, random.random() < 0.1)
            for c in columns))
        where.append(len(lines))
    start = '\ufeff' if random.random() < 0.3 else ''
    with open(path, 'w', newline='', encoding='utf-8') as out:
        out.write(start + end.join(lines) + end)
    return columns, separator, mark, where, lines, end


def run(*arguments):
    done = subprocess.run([evenfield, 'panel', *arguments],
                          capture_output=True, text=True, encoding='utf-8')
    return done.returncode, done.stdout, done.stderr


def counts_of(fits):
    found = {}
    for fit in fits:
        if fit['of'] != 'observer':
            continue
        for p in fit['points']:
            key = fit['observer'], fit['condition'], p['level']
            found[key] = [p['n'], p['k']]
    return found


def curves_of(fits):
    """All that is told but the order of the observers, to the last digit: sums
    run over levels, which are sorted, so the order of rows has no part in it.
    """
    told = {}
    for fit in fits:
        key = fit['of'], fit['observer'], fit['condition']
        told[key] = {name: value for name, value in fit.items()
                     if name not in ('name', 'points')}
    return told


def same(drawn, task, model):
    curves = None
    for kind in (as_trials(drawn, task), as_counts(drawn),
                 as_counts(drawn)):
        write('answers.csv', kind, task)
        status, out, err = run('fit', 'answers.csv', '--task', task,
                               '--samples', '0', '--model', model,
                               '--format', 'json', '--quiet')
        if status != 0:
            return status == 4 and 'no threshold' in err, err
        fits = json.loads(out)['fits']
        if counts_of(fits) != drawn:
            return False, 'other counts than were written'
        if curves is not None and curves_of(fits) != curves:
            return False, 'other curves than for the same answers before'
        curves = curves_of(fits)
    return True, ''


def all_trials(drawn, task):
    write('answers.csv', as_trials(drawn, task), task)
    with open('hand.csv', 'w') as out:
        out.write('level\n1\n2\n')
    status, out, err = run('next', 'answers.csv', '--task', task, '--levels',
                           'hand.csv', '--model', 'gaussian', '--format',
                           'json', '--quiet')
    if status != 0:
        return False, err
    found = {(s['observer'], s['condition']): s['n_trials']
             for s in json.loads(out)['next'] if not s['is_new']}
    wanted = {}
    for (who, condition, _), (n, _) in drawn.items():
        wanted[who, condition] = wanted.get((who, condition), 0) + n
    return found == wanted, 'trials %r, written %r' % (found, wanted)


SPOILT = {'level': ['', 'wide', '1.2.3', 'nan', 'inf', '1e999', '0x1'],
          'observer': [''], 'condition': [''], 'task': ['guess', ''],
          'answer': ['', 'perhaps', '2', 'Yes!'],
          'n': ['', '0', '-3', '2.5', 'many', '1e12'],
          'k': ['', '-1', '0.5', '100000', 'few']}


def refused(drawn, task):
    """A field of a random row is spoilt; the message names line and field."""
    kind = random.choice([as_trials(drawn, task), as_counts(drawn)])
    columns, separator, mark, where, lines, end = write('answers.csv', kind,
                                                        task)
    field = random.choice([c for c in columns if c in SPOILT])
    bad = random.choice(SPOILT[field])
    line = random.choice(where)
    names, rows = kind
    who, condition, level, answer = rows[where.index(line)]
    value = {'observer': who, 'condition': condition, 'level': repr(level),
             'task': task, 'room temperature': '21'}
    value.update(zip(names, answer))
    value[field] = bad
    if field != 'level':
        value['level'] = value['level'].replace('.', mark)
    lines[line - 1] = separator.join(quoted(value[c], separator)
                                     for c in columns)
    with open('answers.csv', 'w', newline='', encoding='utf-8') as out:
        out.write(end.join(lines) + end)
    status, out, err = run('fit', 'answers.csv', '--task', task, '--samples',
                           '0', '--quiet')
    wanted = 'evenfield: answers.csv:%d: field %s: ' % (line, field)
    is_good = status == 3 and out == '' and err.startswith(wanted) and \
        err.count('\n') == 1
    return is_good, '%s spoilt as %r: status %d, %s wanted %s' % (
        field, bad, status, err, wanted)


evenfield = os.path.abspath(sys.argv[1])
with tempfile.TemporaryDirectory() as scratch:
    os.chdir(scratch)
    for i in range(ROUNDS):
        task = list(WORDS)[i % len(WORDS)]
        model = random.choice(['gaussian', 'logistic'])
        drawn = draw(task)
        check('%s, %s: counts and curves' % (task, model),
              *same(drawn, task, model))
        check('%s: trials of next' % task, *all_trials(drawn, task))
        for _ in range(3):
            check('%s: a spoilt field' % task, *refused(drawn, task))
    os.chdir('/')
print('1..%d' % number)
sys.exit(failed > 0)
