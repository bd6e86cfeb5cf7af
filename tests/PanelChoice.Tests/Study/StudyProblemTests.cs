using System.Text;
using PanelChoice.Study;
using Xunit;

namespace PanelChoice.Tests.Study;

public class StudyProblemTests
{
    private const string Panel = StudyText.Panel;
    private const string Small = StudyText.Small;
    private const string Step = "[history]\nprevious = \"step\"\n";
    private const string Nest = "[[nest]]\nname = \"n\"\nmembers = [\"tram\", \"bus\"]\n";
    private const string Term = "[[term]]\nname = \"t\"\n";

    /// <summary>Text, id, line, position, and a word that the sentence must hold. Small is nine lines long, Panel six.</summary>
    public static TheoryData<string, string, int, int, string> Mistakes => new()
    {
        // the head and the tables
        { "titel = \"x\"\n" + Small, "study.unknown_key", 1, 1, "did you mean 'title'?" },
        { "title = 5\n" + Small, "study.wrong_type", 1, 9, "must be text, not a whole number" },
        { Small + "[diagnostics]\ntitle = \"x\"\n", "study.unknown_key", 11, 1, "belongs at the head of the file" },
        { Small + "[diagnostics]\nreplicates = 3\n", "study.unknown_key", 11, 1, "belongs in [inference.bootstrap]" },
        { Small + "[diagnostics]\nlag = 3\n", "study.unknown_key", 11, 1, "belongs in [[term]]; a key belongs to the last table header above it; or did you mean 'lags'?" },
        { Small + "[inference]\nseed = 3\n", "study.unknown_key", 11, 1, "[diagnostics] or [estimate] or [inference.bootstrap]" },
        { Small + "[estimate]\nzzz = 3\n", "study.unknown_key", 11, 1, "use one of: form, starts, seed" },
        { Small + "[histroy]\nprevious = \"step\"\n", "study.unknown_table", 10, 1, "did you mean [history]?" },
        { Small + "[bootstrap]\nreplicates = 3\n", "study.unknown_table", 10, 1, "did you mean [inference.bootstrap]?" },
        { Small + "[inference.bootstrp]\nreplicates = 3\n", "study.unknown_table", 10, 1, "did you mean [inference.bootstrap]?" },
        { Small + "[[terms]]\nname = \"x\"\n", "study.unknown_table", 10, 1, "did you mean [[term]]?" },
        { Small + "[nest]\nname = \"x\"\nmembers = [\"a\"]\n", "study.wrong_type", 10, 1, "write [[nest]] above the keys of each nest" },
        { Small + "[[estimate]]\nstarts = 1\n", "study.wrong_type", 10, 1, "write [estimate] once" },
        { "estimate = 3\n" + Small, "study.wrong_type", 1, 1, "must be a single table" },
        { "[[term]]\nname = \"t\"\ncolumn = \"x\"\n", "study.missing_table", 1, 1, "[panel]" },
        { Panel, "study.missing_table", 1, 1, "no [[term]]" },
        // [panel]
        { Small.Replace("file = \"p.csv\"\n", ""), "study.missing_key", 1, 1, "'file'" },
        { Small.Replace("person = \"commuter\"\n", ""), "study.missing_key", 1, 1, "'person'" },
        { Small.Replace("alternative = \"mode\"\n", ""), "study.missing_key", 1, 1, "'alternative'" },
        { Small.Replace("chosen = \"taken\"\n", ""), "study.missing_key", 1, 1, "'chosen'" },
        { Small.Replace("p.csv", "p.txt"), "study.unknown_value", 2, 1, "ends in .csv or .csv.gz or .parquet" },
        { Small.Replace("p.csv", "p\\u0000.csv"), "study.unknown_value", 2, 1, "no file name can hold" },
        { Small.Replace("\"commuter\"", "\"\""), "study.empty", 3, 10, "'person' in [panel] is empty" },
        { Small.Replace("\"commuter\"", "true"), "study.wrong_type", 3, 10, "must be text, not true or false" },
        { Small.Replace("\"taken\"", "\"mode\""), "study.same_column", 6, 1, "the same column as 'alternative'" },
        { Small.Replace("[panel]\n", "[panel]\nlayout = \"lng\"\n"), "study.unknown_value", 2, 10, "did you mean \"long\"?" },
        { Small.Replace("[panel]\n", "[panel]\nlayout = \"wide\"\n"), "study.not_supported", 2, 1, "wide layout is not supported yet" },
        { Small.Replace("[panel]\n", "[panel]\nalternatives = [\"a\"]\n"), "study.not_supported", 2, 1, "not supported yet" },
        { Small.Replace("[panel]\n", "[panel]\noffered = 1\n"), "study.wrong_type", 2, 11, "must be text" },
        { Small.Replace("[panel]\n", "[panel]\nweight = 1\n"), "study.wrong_type", 2, 10, "must be text" },
        { Small.Replace("[panel]\n", "[panel]\nshared_calendar = \"yes\"\n"), "study.wrong_type", 2, 19, "true or false" },
        { Small.Replace("occasion = \"day\"\n", "shared_calendar = true\n"), "study.needs_key", 4, 1, "names no 'occasion'" },
        // [history]
        { Small + "[history]\nprevious = \"wekday\"\n", "study.unknown_value", 11, 12, "value 'wekday'" },
        { Small + "[history]\nprevious = \"none\"\n", "study.unknown_value", 11, 12, "use \"recorded\" or \"step\" or \"day\" or \"workday\" or \"week\"" },
        { Small + "[history]\nprevious = \"workday\"\nholidays = \"2031-04-14\"\n", "study.wrong_type", 12, 12, "a list of dates" },
        { Small + "[history]\nprevious = \"workday\"\nholidays = [1]\n", "study.wrong_type", 12, 13, "a list of dates" },
        { Small + "[history]\nprevious = \"workday\"\nholidays = [\"2031-04-14\",\n \"2031-02-30\"]\n", "study.unknown_value", 13, 2, "value '2031-02-30'" },
        { Small + "[history]\nprevious = \"workday\"\nholidays = [\"2031-04-14\", 2031-04-14]\n", "study.listed_twice", 12, 27, "lists this twice" },
        { Small + "[history]\nprevious = \"workday\"\nholidays = [2031-04-14T07:00:00]\n", "study.wrong_type", 12, 13, "not a time" },
        { Small + "[history]\nprevious = \"workday\"\nholidays = []\n", "study.empty", 12, 12, "empty list" },
        { Small + "[history]\nprevious = \"day\"\nholidays = [\"2031-04-14\"]\n", "study.needs_key", 12, 1, "only with previous = \"workday\"" },
        { Small + "[history]\nholidays = [\"2031-04-14\"]\n", "study.needs_key", 11, 1, "only with previous = \"workday\"" },
        { Small + "[history]\nprevious = \"step\"\nlongest_gap = 3\n", "study.needs_key", 12, 1, "only with previous = \"recorded\"" },
        { Small + "[history]\nprevious = \"recorded\"\nlongest_gap = 0\n", "study.out_of_range", 12, 15, "1 or more" },
        { Small + "[history]\nprevious = \"recorded\"\nlongest_gap = 1.5\n", "study.wrong_type", 12, 15, "a whole number" },
        { Small + "[history]\nwithout_history = \"keep\"\n", "study.unknown_value", 11, 19, "use \"drop\" or \"zero\"" },
        // [[nest]]
        { Small + "[[nest]]\nmembers = [\"a\"]\n", "study.missing_key", 10, 1, "'name'" },
        { Small + "[[nest]]\nname = \"n\"\n", "study.missing_key", 10, 1, "'members'" },
        { Small + "[[nest]]\nname = \"n\"\nmembers = []\n", "study.empty", 12, 11, "empty list" },
        { Small + "[[nest]]\nname = \"n\"\nmembers = [\"a\", 3]\n", "study.wrong_type", 12, 17, "a list of texts" },
        { Small + "[[nest]]\nname = \"n\"\nmembers = [\"a\", \"a\"]\n", "study.listed_twice", 12, 17, "lists this twice" },
        { Small + Nest + "dissimilarity = 0\n", "study.out_of_range", 13, 17, "above 0" },
        { Small + Nest + "dissimilarity = inf\n", "study.out_of_range", 13, 17, "finite" },
        { Small + Nest + "dissimilarity = \"0.5\"\n", "study.wrong_type", 13, 17, "a number" },
        { Small + Nest + "same_as = \"n\"\n", "study.same_as_cycle", 13, 1, "shares its own parameter" },
        { Small + Nest + "same_as = \"road\"\n", "study.unknown_nest", 13, 1, "does not exist" },
        { Small + Nest + "[[nest]]\nname = \"road\"\nmembers = [\"car\"]\nsame_as = \"n\"\ndissimilarity = 1\n", "study.excluded_key", 16, 1, "keep one of" },
        { Small + Nest + "same_as = \"road\"\n[[nest]]\nname = \"road\"\nmembers = [\"car\"]\nsame_as = \"n\"\n", "study.same_as_cycle", 13, 1, "by way of 'road'" },
        { Small + Nest + "[[nest]]\nname = \"n\"\nmembers = [\"car\"]\n", "study.duplicate_name", 14, 1, "already stands in line 10" },
        { Small + Nest + "[[nest]]\nname = \"road\"\nmembers = [\"car\", \"bus\"]\n", "study.two_nests", 15, 1, "'bus' is a member of the nest 'n' and of the nest 'road'" },
        { Small + "[[nest]]\nname = \"n\"\nmembers = [\"n\", \"a\"]\n", "study.nest_cycle", 12, 1, "holds itself" },
        { Small + "[[nest]]\nname = \"n\"\nmembers = [\"m\"]\n[[nest]]\nname = \"m\"\nmembers = [\"n\"]\n", "study.nest_cycle", 12, 1, "by way of 'm'" },
        { Small + Nest + "membres = [\"x\"]\n", "study.unknown_key", 13, 1, "did you mean 'members'?" },
        // [[term]]
        { Panel + "[[term]]\ncolumn = \"x\"\n", "study.missing_key", 7, 1, "'name'" },
        { Small + "[[term]]\nname = \"time\"\ncolumn = \"x\"\n", "study.duplicate_name", 11, 1, "already stands in line 7" },
        { Panel + Term, "study.no_source", 7, 1, "the term 't' has no source" },
        { Panel + Term + "constant = false\nbase = \"a\"\neach = true\n", "study.no_source", 7, 1, "has no source" },
        { Panel + Term + "lag = 1\n" + Step, "study.no_source", 7, 1, "has no source" },
        { Panel + Term + "column = \"x\"\nlast_choice = 1\n" + Step, "study.several_sources", 10, 1, "column, last_choice" },
        { Panel + Term + "stock = 0.5\nconstant = true\neach = true\nbase = \"a\"\n", "study.several_sources", 10, 1, "stock, constant" },
        { Panel + Term + "column = 3\n", "study.wrong_type", 9, 10, "must be text" },
        { Panel + Term + "constant = 1\nalternatives = [\"a\"]\n", "study.wrong_type", 9, 12, "true or false" },
        { Panel + Term + "last_choice = true\n" + Step, "study.wrong_type", 9, 15, "write last_choice = 1" },
        { Panel + Term + "last_choice = 0\n" + Step, "study.out_of_range", 9, 15, "1 or more" },
        { Panel + Term + "last_choice = 99999999999\n" + Step, "study.out_of_range", 9, 15, "at most 2147483647" },
        { Small + "[estimate]\nstarts = 100001\n", "study.out_of_range", 11, 10, "at most 100000" },
        { Small + "[inference.bootstrap]\nreplicates = 1000001\n", "study.out_of_range", 11, 14, "at most 1000000" },
        { Small + "[diagnostics]\nlags = 1001\n", "study.out_of_range", 11, 8, "at most 1000" },
        { Small + "[diagnostics]\ndraws = 10000001\n", "study.out_of_range", 11, 9, "at most 10000000" },
        { Panel + Term + "last_nest = 0\n" + Step + Nest, "study.out_of_range", 9, 13, "1 or more" },
        { Panel + Term + "last_nest = 1\n" + Step, "study.needs_key", 9, 1, "the study has no nests" },
        { Panel + Term + "stock = 1\n", "study.out_of_range", 9, 9, "between 0 and 1" },
        { Panel + Term + "stock = nan\n", "study.out_of_range", 9, 9, "between 0 and 1" },
        { Panel + Term + "past_share = \"true\"\n", "study.wrong_type", 9, 14, "without quotes" },
        { Panel + Term + "first_choice = 1\n", "study.wrong_type", 9, 16, "true or false" },
        { Panel + Term + "column = \"x\"\nlag = 0\n" + Step, "study.out_of_range", 10, 7, "1 or more" },
        { Panel + Term + "column = \"x\"\nlag = 1.0\n" + Step, "study.wrong_type", 10, 7, "a whole number" },
        { Panel + Term + "column = \"x\"\nlead = 0\n" + Step, "study.out_of_range", 10, 8, "1 or more" },
        { Panel + Term + "column = \"x\"\nchange = 0\n" + Step, "study.out_of_range", 10, 10, "1 or more" },
        { Panel + Term + "column = \"x\"\nchosen_then = 0\n" + Step, "study.out_of_range", 10, 15, "1 or more" },
        { Panel + Term + "column = \"x\"\nperson_mean = 1\n", "study.wrong_type", 10, 15, "true or false" },
        { Panel + Term + "column = \"x\"\nlag = 1\nchange = 1\n" + Step, "study.several_moments", 11, 1, "lag, change" },
        { Panel + Term + "last_choice = 1\nlag = 1\n" + Step, "study.needs_key", 10, 1, "'lag' works on a 'column'" },
        { Panel + Term + "stock = 0.5\nperson_mean = true\n", "study.needs_key", 10, 1, "'person_mean' works on a 'column'" },
        { Panel + Term + "stock = 0.5\ntransform = \"log\"\n", "study.needs_key", 10, 1, "'transform' works on a 'column'" },
        { Panel + Term + "stock = 0.5\nis = \"Mon\"\n", "study.needs_key", 10, 1, "'is' works on a 'column'" },
        { Panel + Term + "column = \"x\"\ntransform = \"sqrt\"\n", "study.unknown_value", 10, 13, "use \"log\"" },
        { Panel + Term + "column = \"x\"\nis = 3\n", "study.wrong_type", 10, 6, "must be text" },
        { Panel + Term + "column = \"x\"\nis = \"a\"\ntransform = \"log\"\n", "study.excluded_key", 11, 1, "no logarithm" },
        { Panel + Term + "column = \"x\"\nomit = \"a\"\n", "study.needs_key", 10, 1, "'omit' without 'levels'" },
        { Panel + Term + "column = \"x\"\nlevels = true\n", "study.needs_key", 10, 1, "'levels' without 'omit'" },
        { Panel + Term + "column = \"x\"\nlevels = \"Mon\"\nomit = \"a\"\n", "study.wrong_type", 10, 10, "true or false" },
        { Panel + Term + "column = \"x\"\nlevels = true\nomit = \"a\"\nis = \"b\"\n", "study.excluded_key", 12, 1, "both 'is' and 'levels'" },
        { Panel + Term + "column = \"x\"\nalternatives = \"tram\"\n", "study.wrong_type", 10, 16, "a list of texts" },
        { Panel + Term + "column = \"x\"\nalternatives = [\"tram\", \"tram\"]\n", "study.listed_twice", 10, 25, "lists this twice" },
        { Panel + Term + "column = \"x\"\nalternatives = [\"\"]\n", "study.empty", 10, 17, "is empty" },
        { Panel + Term + "column = \"x\"\neach = 1\n", "study.wrong_type", 10, 8, "true or false" },
        { Panel + Term + "column = \"x\"\nbase = \"tram\"\n", "study.needs_key", 10, 1, "'base' without 'each'" },
        { Panel + Term + "column = \"x\"\nbase = 1\neach = true\n", "study.wrong_type", 10, 8, "must be text" },
        { Panel + Term + "constant = true\neach = true\n", "study.needs_key", 10, 1, "needs a 'base'" },
        { Panel + Term + "constant = true\n", "study.same_for_all", 9, 1, "changes no choice" },
        { Panel + Term + "column = \"x\"\neach = true\nalternatives = [\"a\"]\nbase = \"a\"\n", "study.only_base", 12, 1, "its base alone" },
        { Panel + Term + "column = \"x\"\ntimes = 2\n", "study.wrong_type", 10, 9, "must be text" },
        { Panel + Term + "column = \"x\"\nscale = 0\n", "study.out_of_range", 10, 9, "other than 0" },
        { Panel + Term + "column = \"x\"\nscale = inf\n", "study.out_of_range", 10, 9, "finite" },
        { Panel + Term + "column = \"x\"\nfixed = nan\n", "study.out_of_range", 10, 9, "finite" },
        { Panel + Term + "column = \"x\"\nstart = \"1\"\n", "study.wrong_type", 10, 9, "a number" },
        { Panel + Term + "column = \"x\"\nfixed = 1\nstart = 1\n", "study.excluded_key", 11, 1, "keep one of 'fixed' and 'start'" },
        { Panel + Term + "column = \"x\"\nalternatives = [\"n\"]\n" + Nest, "study.name_clash", 10, 1, "names a nest where an alternative belongs" },
        { Panel + Term + "column = \"x\"\neach = true\nbase = \"n\"\n" + Nest, "study.name_clash", 11, 1, "is a nest" },
        { Panel + Term + "last_choice = 1\n", "study.no_previous", 7, 1, "[history] does not say" },
        { Panel + Term + "last_nest = 1\n" + Nest, "study.no_previous", 7, 1, "[history] does not say" },
        { Panel + Term + "column = \"x\"\nlag = 1\n", "study.no_previous", 7, 1, "[history] does not say" },
        { Panel + Term + "column = \"x\"\nlead = 1\n", "study.no_previous", 7, 1, "[history] does not say" },
        { Panel + Term + "column = \"x\"\nchange = 1\n", "study.no_previous", 7, 1, "[history] does not say" },
        { Panel + Term + "column = \"x\"\nchosen_then = 1\n", "study.no_previous", 7, 1, "[history] does not say" },
        { Panel.Replace("occasion = \"day\"\n", "") + Term + "past_share = true\n", "study.no_occasion", 6, 1, "names no 'occasion'" },
        { Panel.Replace("occasion = \"day\"\n", "") + Term + "last_choice = 1\n", "study.no_occasion", 6, 1, "names no 'occasion'" },
        // [estimate], [inference], [diagnostics]
        { Small + "[estimate]\nform = \"unscaledd\"\n", "study.unknown_value", 11, 8, "did you mean \"unscaled\"?" },
        { Small + "[estimate]\nstarts = 0\n", "study.out_of_range", 11, 10, "1 or more" },
        { Small + "[estimate]\nseed = \"x\"\n", "study.wrong_type", 11, 8, "a whole number" },
        { Small + "[inference]\ncluster = 1\n", "study.wrong_type", 11, 11, "must be text" },
        { Small + "[inference]\nsecond_cluster = \"person\"\n", "study.same_column", 11, 1, "the clusters of 'cluster' again" },
        { Small + "[inference]\ncluster = \"household\"\nsecond_cluster = \"household\"\n", "study.same_column", 12, 1, "the clusters of 'cluster' again" },
        { Small + "[inference]\nsecond_cluster = 3\n", "study.wrong_type", 11, 18, "must be text" },
        { Small + "[inference]\nconfidence = 1\n", "study.out_of_range", 11, 14, "between 0 and 1" },
        { Small + "[inference]\nconfidence = 0.0\n", "study.out_of_range", 11, 14, "between 0 and 1" },
        { Small + "[inference]\njackknife = \"yes\"\n", "study.unknown_value", 11, 13, "\"one_step\"" },
        { Small + "[inference]\nbootstrap = 3\n", "study.wrong_type", 11, 1, "write [inference.bootstrap] once" },
        { Small + "[inference.bootstrap]\nreplicates = -1\n", "study.out_of_range", 11, 14, "0 or more" },
        { Small + "[inference.bootstrap]\ntarget = 0.05\n", "study.needs_key", 11, 1, "replicates = \"auto\"" },
        { Small + "[inference.bootstrap]\nreplicates = \"auto\"\ntarget = 0.001\n", "study.out_of_range", 12, 10, "0.02 to 0.25" },
        { Small + "[inference.bootstrap]\nreplicates = \"many\"\n", "study.wrong_type", 11, 14, "a whole number" },
        { Small + "[inference.bootstrap]\nblocks = \"moving\"\ndraw = \"exponential\"\n", "study.excluded_key", 12, 1, "cannot weigh blocks" },
        { Small + "[inference.bootstrap]\ndraw = \"count\"\n", "study.unknown_value", 11, 8, "did you mean \"counts\"?" },
        { Small + "[inference.bootstrap]\nblocks = \"clusters\"\n", "study.unknown_value", 11, 10, "did you mean \"cluster\"?" },
        { Small + "[inference.bootstrap]\nlength = 5\n", "study.needs_key", 11, 1, "blocks = \"moving\"" },
        { Small + "[inference.bootstrap]\nseed = 1.5\n", "study.wrong_type", 11, 8, "a whole number" },
        { Small + "[diagnostics]\nlags = 0\n", "study.out_of_range", 11, 8, "1 or more" },
        { Small + "[diagnostics]\nlevel = 1.0\n", "study.out_of_range", 11, 9, "between 0 and 1" },
        { Small + "[diagnostics]\ndraws = 0\n", "study.out_of_range", 11, 9, "1 or more" },
        { Small + "[diagnostics]\nseed = true\n", "study.wrong_type", 11, 8, "a whole number" },
        // [[test]]
        { Small + "[[test]]\nterms = [\"time\"]\n", "study.missing_key", 10, 1, "has no 'name'" },
        { Small + "[[test]]\nname = \"x\"\n", "study.missing_key", 10, 1, "has no 'terms'" },
        { Small + "[[test]]\nname = \"x\"\nterms = [\"tyme\"]\n", "study.unknown_term", 12, 10, "did you mean 'time'?" },
        { Small + "[[test]]\nname = \"x\"\nterms = [\"tyme: tram\"]\n", "study.unknown_term", 12, 10, "did you mean 'time: tram'?" },
        { Small + "[[test]]\nname = \"x\"\nterms = [\"time: tram\"]\n", "study.test_alternative", 12, 10, "write \"time\"" },
        { Small + "each = true\nbase = \"drive\"\n[[test]]\nname = \"x\"\nterms = [\"time: drive\"]\n", "study.test_alternative", 14, 10, "is the base of 'time'" },
        { Small + "each = true\nalternatives = [\"drive\", \"tram\"]\n[[test]]\nname = \"x\"\nterms = [\"time: tran\"]\n", "study.test_alternative", 14, 10, "did you mean 'tram'?" },
        { Small + "fixed = 1\n[[test]]\nname = \"x\"\nterms = [\"time\"]\n", "study.test_fixed", 13, 10, "is fixed" },
        { Small + "[[test]]\nname = \"x\"\nterms = [\"time\"]\nvalues = [1, 2]\n", "study.test_values", 13, 1, "a test of 1 coefficients has 2 values" },
        { Small + "[[test]]\nname = \"x\"\nterms = [\"time\"]\nvalues = [\"1\"]\n", "study.wrong_type", 13, 11, "a list of numbers" },
        { Small + "[[test]]\nname = \"x\"\nterms = [\"time\"]\nvalues = [inf]\n", "study.out_of_range", 13, 11, "finite" },
        { Small + "[[test]]\nname = \"x\"\nterms = [\"time\"]\nvalues = [1]\nequal = true\n", "study.excluded_key", 14, 1, "keep 'values'" },
        { Small + "[[test]]\nname = \"x\"\nterms = [\"time\"]\nequal = true\n", "study.test_one", 12, 1, "two or more" },
        { Small + "[[nest]]\nname = \"n\"\nmembers = [\"a\", \"b\"]\n[[test]]\nname = \"x\"\nterms = [\"time\", \"n\"]\nequal = true\n", "study.test_mixed", 15, 1, "a test for each kind" },
        { Small + "[[nest]]\nname = \"n\"\nmembers = [\"a\", \"b\"]\n[[test]]\nname = \"x\"\nterms = [\"n\"]\nvalues = [0]\n", "study.out_of_range", 16, 11, "above 0" },
        { Small + "[[nest]]\nname = \"n\"\nmembers = [\"a\", \"b\"]\ndissimilarity = 0.5\n[[test]]\nname = \"x\"\nterms = [\"n\"]\n", "study.test_fixed", 16, 10, "is fixed" },
        { Small + "[[test]]\nname = \"x\"\nterms = [\"time\"]\n[[test]]\nname = \"x\"\nterms = [\"time\"]\n", "study.duplicate_name", 14, 1, "already stands in line 10" },
        { Small + "[[test]]\nname = \"x\"\nterms = [\"time\"]\nvalue = [1]\n", "study.unknown_key", 13, 1, "did you mean 'values'?" },
        { Small + "[inference]\nscore_draws = -1\n", "study.out_of_range", 11, 15, "0 or more" },
        { Small + "[[taste]]\nname = \"x\"\n", "study.not_supported", 10, 1, "[[taste]] is not supported yet" },
        { Small + "[initial]\nx = 1\n", "study.not_supported", 10, 1, "[initial] is not supported yet" },
        // keys and tables defined twice
        { Small + "column = \"fare\"\n", "study.duplicate_key", 10, 1, "of [[term]] already stands in line 9" },
        { Small + "[estimate]\nstarts = 1\n[history]\n[estimate]\nstarts = 2\nseed = 1\n", "study.duplicate_table", 13, 1, "already defined in line 10" },
        { Small + "[term]\nx = 1\n", "study.duplicate_table", 10, 1, "in one way" },
        { Small + "[term.deep]\nx = 1\n", "study.unknown_table", 10, 1, "no table" },
        { "panel.file = \"p.csv\"\n" + Small, "study.duplicate_table", 2, 1, "already defined in line 1" },
        // syntax
        { Small + "[estimate]\nstarts = \nseed = 3\n", "study.syntax", 11, 10, "this is not TOML" },
        { Small + "[estimate\nstarts = 3\n", "study.syntax", 10, 10, "this is not TOML" },
        { Small + "[estimate]\nform = \"unscaled\nstarts = 3\nseed = 3\n", "study.syntax", 11, 17, "this is not TOML" },
        { Small + "[estimate]\nform = unscaled\n", "study.syntax", 11, 8, "this is not TOML" },
        { Small + "[estimate]\nstarts = 012\n", "study.syntax", 11, 10, "this is not TOML" },
        { Small + "[estimate]\nstarts = 1 seed = 2\n", "study.syntax", 11, 12, "this is not TOML" },
        { Small + "[estimate]\nstarts = True\n", "study.syntax", 11, 10, "this is not TOML" },
        { Small + "alternatives = [\"a\", \"b\"\nscale = 3\n", "study.syntax", 11, 1, "this is not TOML" },
    };

    [Theory]
    [MemberData(nameof(Mistakes))]
    public void Each_mistake_is_one_problem_with_its_place(string text, string id, int line, int position, string words)
    {
        var read = StudyText.Read(text);
        Assert.Null(read.Value);
        Assert.True(read.Problems.Length == 1, string.Join("\n", read.Problems.Select(p => $"{p.Id}: {p.Sentence}")));
        var problem = read.Problems[0];
        Assert.Equal((id, line, position), (problem.Id, problem.Line!.Value, problem.Position!.Value));
        Assert.Contains(words, problem.Sentence, StringComparison.Ordinal);
        Assert.NotEmpty(problem.Remedy);
    }

    [Fact]
    public void All_mistakes_are_reported_together_in_the_order_of_the_file()
    {
        var read = StudyText.Read(
            """
            titel = "x"
            [panel]
            file = "p.csv"
              person = 3
            alternative = "mode"
            [[term]]
            name = "a"
            colum = "x"
            [[term]]
            name = "a"
            column = "x"
            scale = 0
            [inference]
            confidence = 95
            second_cluster = "occasion"
            [inference.bootstrap]
            target = 0.1
            """);
        Assert.Equal(
            [
                ("study.unknown_key", 1, 1), ("study.missing_key", 2, 1), ("study.wrong_type", 4, 12), ("study.no_source", 6, 1),
                ("study.unknown_key", 8, 1), ("study.duplicate_name", 10, 1), ("study.out_of_range", 12, 9), ("study.out_of_range", 14, 14),
                ("study.needs_key", 15, 1), ("study.needs_key", 17, 1),
            ],
            read.Problems.Select(p => (p.Id, p.Line!.Value, p.Position!.Value)));
    }

    [Fact]
    public void A_missing_rule_of_history_is_told_once() =>
        Assert.Equal(
            ["study.no_previous"],
            StudyText.Read(Panel + "[[term]]\nname = \"a\"\nlast_choice = 1\n[[term]]\nname = \"b\"\nlast_choice = 2\n").Problems.Select(p => p.Id));

    [Fact]
    public void Places_hold_with_a_byte_order_mark_and_carriage_returns()
    {
        var text = ("titel = \"x\"\n" + Small + "[estimate]\n  starts = 0\n").Replace("\n", "\r\n", StringComparison.Ordinal);
        var read = StudyText.ReadBytes([.. Encoding.UTF8.Preamble, .. Encoding.UTF8.GetBytes(text)]);
        Assert.Equal(
            [("study.unknown_key", 1, 1), ("study.out_of_range", 12, 12)], read.Problems.Select(p => (p.Id, p.Line!.Value, p.Position!.Value)));
    }

    [Fact]
    public void Positions_count_characters_not_bytes()
    {
        var problem = Assert.Single(StudyText.Read(Small + "[[nest]]\nname = \"née\"\nmembers = [\"fähre\", 3]\n").Problems);
        Assert.Equal((12, 21), (problem.Line!.Value, problem.Position!.Value));
    }

    [Fact]
    public void Two_syntax_errors_far_apart_are_two_problems_and_what_stands_before_them_is_checked()
    {
        var read = StudyText.Read("titel = \"x\"\n" + Small.Replace("name = \"time\"", "name = time", StringComparison.Ordinal) + "[estimate]\nform = \nseed = \"late\"\n");
        Assert.Equal(
            [("study.unknown_key", 1), ("study.syntax", 9), ("study.syntax", 12)], read.Problems.Select(p => (p.Id, p.Line!.Value)));
    }

    [Theory]
    [InlineData("[", "]")]
    [InlineData("{a=", "}")]
    public void Brackets_nested_without_end_are_a_problem_not_a_crash(string open, string close)
    {
        var deep = $"a = {string.Concat(Enumerable.Repeat(open, 5000))}1{string.Concat(Enumerable.Repeat(close, 5000))}\n";
        var problem = Assert.Single(StudyText.Read(deep + Small).Problems);
        Assert.Equal("study.syntax", problem.Id);
        Assert.Contains("too deep inside each other", problem.Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void A_study_file_that_is_not_there_is_one_problem()
    {
        var problem = Assert.Single(StudyFileReader.Read(Path.Combine(Path.GetTempPath(), "panelchoice-no-such-study.toml")).Problems);
        Assert.Equal("study.not_found", problem.Id);
        Assert.Contains("no such study file", problem.Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void A_link_to_a_study_file_that_is_not_there_is_not_found()
    {
        if (OperatingSystem.IsWindows()) return;
        var link = Path.Combine(Path.GetTempPath(), $"panelchoice-{Guid.NewGuid():N}.toml");
        File.CreateSymbolicLink(link, link + ".gone");
        try
        {
            Assert.Equal("study.not_found", Assert.Single(StudyFileReader.Read(link).Problems).Id);
        }
        finally
        {
            File.Delete(link);
        }
    }

    [Fact]
    public void A_study_file_that_another_program_holds_is_a_problem_with_the_reason()
    {
        var path = Path.GetTempFileName();
        try
        {
            using var held = new FileStream(path, FileMode.Open, FileAccess.ReadWrite, FileShare.None);
            Assert.Equal("study.unreadable", Assert.Single(StudyFileReader.Read(path).Problems).Id);
        }
        finally
        {
            File.Delete(path);
        }
    }

    [Fact]
    public void A_folder_is_not_a_study_file()
    {
        var problem = Assert.Single(StudyFileReader.Read(Path.GetTempPath()).Problems);
        Assert.Equal("study.not_found", problem.Id);
        Assert.Contains("folder", problem.Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void Bytes_that_are_not_utf8_are_a_problem_with_their_line()
    {
        var problem = Assert.Single(StudyText.ReadBytes([.. Encoding.UTF8.GetBytes("title = \"x\"\n# f"), 0xE4, (byte)'h', (byte)'\n']).Problems);
        Assert.Equal(("study.not_utf8", 2), (problem.Id, problem.Line!.Value));
    }

    [Fact]
    public void Utf16_is_a_problem_not_a_crash() =>
        Assert.Equal("study.not_utf8", Assert.Single(StudyText.ReadBytes([.. Encoding.Unicode.Preamble, .. Encoding.Unicode.GetBytes(Small)]).Problems).Id);

    [Fact]
    public void An_empty_file_lacks_its_panel_and_its_terms() =>
        Assert.Equal(["study.missing_table", "study.missing_table"], StudyText.Read("").Problems.Select(p => p.Id));

    [Fact]
    public void A_sentence_is_one_plain_line()
    {
        var problem = Assert.Single(StudyText.Read(Small + "[estimate]\nstarts = 0\n").Problems);
        Assert.EndsWith(
            "study.toml, line 11, column 10, value '0': 'starts' in [estimate] must be a whole number of 1 or more; change the value.", problem.Sentence, StringComparison.Ordinal);
    }
}
