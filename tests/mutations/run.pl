#!/usr/bin/env perl
# Breaks the passes on purpose, one line at a time, and sees whether the tests notice; see README.md, whose table it
# writes.
#
#   perl tests/mutations/run.pl [--build=FOLDER] [--first] [--open] [PART...]
#
# PART: of mutations' names, "trim_end" or "trim_end 3". --first: only the test cases that the list names for the file. --open: only those that the table does not call noticed.
#
# A mutation never touches the tree: the changed file is compiled beside it (-O1) and linked before the library of
# passes, so a cycle is one compilation and one link. Each of its test programs stops at the first failure.
use strict;
use warnings;
use Cwd qw(abs_path);
use Fcntl qw(:flock);
use File::Basename qw(dirname);
use File::Temp qw(tempdir);

my $tree = abs_path(dirname(__FILE__) . '/../..');
my $list = "$tree/tests/mutations/list.txt";
my $table = "$tree/tests/mutations/README.md";
my $marker = "<!-- from here on written by run.pl -->\n";
my @programs = qw(test_passes test_outside test_properties);
# Of processor time, for the cases that are run first and for a whole program; more is noticed as endless.
my ($most_seconds_first, $most_seconds) = (40, 150);
my $most_kilobytes = 6_000_000;
my $scratch = tempdir(CLEANUP => 1);

my $build = "$tree/build";
my ($only_first, $only_open, @wanted);
for (@ARGV) {
  if (/^--build=(.+)/) { $build = abs_path($1) or die "no folder $1\n"; }
  elsif ($_ eq '--first') { $only_first = 1; }
  elsif ($_ eq '--open') { $only_open = 1; }
  else { push @wanted, $_; }
}

sub slurp {
  my ($name) = @_;
  open(my $in, '<', $name) or die "$name: $!\n";
  local $/;
  return scalar <$in>;
}

# Blocks of the list: { name, file, first (cases to run first), what, before, after }.
sub mutations {
  my (@all, %seen, $file, $first);
  my $text = slurp($list);
  for my $block (split /\n\n+/, $text) {
    my @lines = grep { !/^#/ } split /\n/, $block;
    next unless @lines;
    if ($lines[0] =~ /^file (\S+)$/) {
      $file = $1;
      ($first) = ($lines[1] // '') =~ /^first (.+)$/ or die "list: no `first` line for $file\n";
      next;
    }
    my $title = shift @lines;
    my ($number, $what) = $title =~ /^(\d+) (.+)$/ or die "list: not a title: $title\n";
    my ($stem) = $file =~ m{([^/]+)\.cpp$};
    my $name = "$stem $number";
    die "list: $name twice\n" if $seen{$name}++;
    my @before = map { /^- (.*)$/ ? $1 : () } @lines;
    my @after = map { /^\+ ?(.*)$/ ? $1 : () } @lines;
    die "list: $name has no before or stray lines\n" if !@before || @before + @after != @lines;
    push @all, {name => $name, file => $file, first => $first, what => $what, before => \@before, after => \@after};
  }
  return @all;
}

# The file with the lines exchanged; dies where they do not stand there exactly once.
sub mutated {
  my ($m) = @_;
  my $text = slurp("$tree/$m->{file}");
  my $pattern = join("\n", map { '[ \t]*' . quotemeta } @{$m->{before}});
  my $count = () = $text =~ /^$pattern$/mg;
  die "$m->{name}: the lines before occur $count times in $m->{file}, not once\n" if $count != 1;
  my $after = join("\n", @{$m->{after}});
  $text =~ s/^$pattern$/$after/m;
  return $text;
}

sub command_for {
  my ($file) = @_;
  my $commands = slurp("$build/compile_commands.json");
  my ($command) = $commands =~ /"command": "((?:[^"\\]|\\.)*)",\s*"file": "\Q$tree\/$file\E"/
    or die "no command for $file in $build\n";
  $command =~ s/\\(.)/$1/g;
  return $command;
}

sub run {
  my ($command, $output, $seconds) = @_;
  $seconds //= $most_seconds;
  return system('bash', '-c', "cd '$build' && ulimit -t $seconds -v $most_kilobytes && $command >'$output' 2>&1");
}

sub link_command {
  my ($program) = @_;
  my @lines = split /\n/, `ninja -C '$build' -t commands $program | tail -n 1`;
  my ($command) = $lines[-1] =~ /^: && (.*) && :$/ or die "no link of $program in $build\n";
  return $command;
}

# The test case that failed, or what else there is to say of a program that did not succeed.
sub complaint {
  my ($status, $output) = @_;
  my $signal = $status & 127 || ($status >> 8 > 128 ? ($status >> 8) - 128 : 0);
  return 'endless' if $signal == 24 || $signal == 9;
  my ($case, $last) = ("stops (status $status)", '');
  for (split /\n/, slurp($output)) {  # cases that only say something come with their names, too
    $case = $1 if $last eq 'TEST CASE:' && /^  (.+)$/;
    $case = $1 if /^TEST CASE:\s+(.+)$/;
    $last = $_;
    last if /ERROR: /;
  }
  return $case;
}

sub verdict {
  my ($m) = @_;
  my ($source, $object) = ("$scratch/mutated.cpp", "$scratch/mutated.o");
  open(my $out, '>', $source) or die "$source: $!\n";
  print $out mutated($m);
  close $out;
  my $compile = command_for($m->{file});
  $compile =~ s/-o \S+ -c \S+$/-O1 -Wno-error -o $object -c $source/ or die "unknown form of command: $compile\n";
  if (run($compile, "$scratch/log") != 0) {
    print slurp("$scratch/log");
    return 'does not compile';
  }
  my $others = "'--test-case-exclude=$m->{first}'";
  my @stages = (["test_passes", "'--test-case=$m->{first}'"], ["test_passes", $others],
                ["test_outside", ''], ["test_properties", '']);
  splice @stages, 1 if $only_first;
  for my $stage (@stages) {
    my ($program, $cases) = @$stage;
    my $link = link_command($program);
    $link =~ s/-o $program /$object -o $scratch\/$program / or die "unknown form of link: $link\n";
    die "$m->{name}: cannot link\n" . slurp("$scratch/log") if run($link, "$scratch/log") != 0;
    my $seconds = $stage == $stages[0] ? $most_seconds_first : $most_seconds;
    my $status = run("$scratch/$program --abort-after=1 $cases", "$scratch/log", $seconds);
    return 'noticed: ' . complaint($status, "$scratch/log") if $status != 0;
  }
  return 'missed';
}

my @all = mutations();

# Results of earlier runs, by name.
sub known_results {
  my %results;
  return %results unless -e $table;
  for (split /\n/, slurp($table)) {
    $results{$1} = $2 if /^\| (\w+ \d+) \| .* \| ([^|]+) \|$/;
  }
  return %results;
}

# Adds a result to those in the table, which another run may be writing, too.
sub record {
  my ($name, $result) = @_;
  open(my $lock, '<', $list) or die "$list: $!\n";
  flock($lock, LOCK_EX) or die "$list: $!\n";
  my %results = known_results();
  $results{$name} = $result;
  write_table(\%results);
  close $lock;
}

sub write_table {
  my ($results) = @_;
  my ($head) = split /\Q$marker\E/, -e $table ? slurp($table) : '';
  my (%total, %noticed, @files);
  my $rows = '';
  for my $m (@all) {
    my $result = $results->{$m->{name}} // 'not run';
    push @files, $m->{file} unless $total{$m->{file}}++;
    $noticed{$m->{file}} += $result =~ /^noticed/ ? 1 : 0;
    $rows .= "| $m->{name} | $m->{what} | $result |\n";
  }
  my ($all, $seen) = (scalar @all, 0);
  my $summary = '';
  for my $file (@files) {
    $seen += $noticed{$file};
    $summary .= "| $file | $total{$file} | $noticed{$file} |\n";
  }
  open(my $out, '>', "$table.new") or die "$table.new: $!\n";
  print $out $head, $marker, "\n## Noticed: $seen of $all\n\n| file | mutations | noticed |\n|---|---|---|\n", $summary,
    "\n## The list\n\n| mutation | what breaks | result: the first test case that fails |\n|---|---|---|\n", $rows;
  close $out;
  rename("$table.new", $table) or die "$table: $!\n";
}

my @stale = grep { !eval { mutated($_); 1 } && print STDERR $@ } @all;
die scalar(@stale) . " mutations do not fit the tree\n" if @stale;
my %results = known_results();
my @chosen = grep {
  my $m = $_;
  (!@wanted || grep { index("$m->{name} ", "$_ ") == 0 } @wanted) &&
    !($only_open && ($results{$m->{name}} // '') =~ /^noticed/)
} @all;
die "no such mutation\n" unless @chosen;

system('ninja', '-C', $build, @programs) == 0 or die "the tree does not build\n";
if (@chosen == @all) {
  for my $program (@programs) {
    die "$program fails without any mutation\n" if run("./$program", "$scratch/log") != 0;
  }
}
my $missed = 0;
for my $m (@chosen) {
  my %now = known_results();  # another run may have been there
  next if $only_open && ($now{$m->{name}} // '') =~ /^noticed/;
  my $begin = time;
  my $result = verdict($m);
  printf "%-26s %4d s  %s\n", $m->{name}, time - $begin, $result;
  STDOUT->flush();
  $missed += $result !~ /^noticed/;
  $result = 'missed by the first cases, others not run' if $only_first && $result eq 'missed';
  record($m->{name}, $result);
}
printf "%d of %d noticed\n", @chosen - $missed, scalar @chosen;
exit($missed ? 1 : 0);
