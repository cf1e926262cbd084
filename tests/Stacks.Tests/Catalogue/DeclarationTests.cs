using System.Text.RegularExpressions;
using Stacks.Abstractions;
using Stacks.Pipeline;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Catalogue;

/// <summary>Help, recipe checks, provenance and documentation read the plugins' declarations: none may be empty or contradict itself.</summary>
public partial class DeclarationTests
{
    private static readonly PluginCatalogue Catalogue = PluginCatalogue.Load(Path.GetDirectoryName(Checkout.Host)!, [PluginCatalogueTests.PluginFolder]);

    public static TheoryData<string> Filters => [.. Catalogue.Filters.Select(f => f.Plugin.Id)];

    [Fact]
    public void Something_is_installed()
    {
        Assert.NotEmpty(Catalogue.Filters);
        Assert.NotEmpty(Catalogue.Formats);
    }

    [Theory]
    [MemberData(nameof(Filters))]
    public void A_filter_tells_what_it_is(string id)
    {
        IFilterPlugin filter = Catalogue.Filter(id)!.Plugin;

        Assert.Matches(HyphenatedWords(), filter.Id);
        Sentence(filter.Summary);
        Sentence(filter.Source);
        Assert.NotEmpty(filter.WorkTypes);
        Assert.Equal(filter.WorkTypes.Distinct(), filter.WorkTypes);
        Assert.True(filter.WorkTypes.Contains(WorkType.Float64), "doubles can be converted to no other type");
        Assert.Equal(filter.Parameters.Select(p => p.Name).Distinct(), filter.Parameters.Select(p => p.Name));
    }

    [Theory]
    [MemberData(nameof(Filters))]
    public void Every_parameter_is_explained_and_its_default_is_allowed(string id)
    {
        foreach (ParameterSpec spec in Catalogue.Filter(id)!.Plugin.Parameters)
        {
            Assert.Matches(SnakeWords(), spec.Name);
            Assert.DoesNotContain(spec.Name, new[] { "filter", "channel" });
            Sentence(spec.Meaning);
            Sentence(spec.WhenRaised);
            Sentence(spec.WhenLowered);
            Assert.NotEmpty(spec.Range);
            Assert.True(spec.Minimum <= spec.Maximum, spec.Name);
            if (spec.Kind == ParameterKind.Choice)
                Assert.NotEmpty(spec.Words);
            if (spec.Default is not null)
                spec.Check(spec.Default);
        }
    }

    [Theory]
    [MemberData(nameof(Filters))]
    public void Defaults_survive_the_way_through_a_recipe(string id)
    {
        foreach (ParameterSpec spec in Catalogue.Filter(id)!.Plugin.Parameters.Where(s => s.Default is not null))
        {
            string text = spec.Default!.Form is ParameterForm.Word or ParameterForm.Percent ? $"\"{spec.Default}\"" : spec.Default.ToString();
            StepSection step = Assert.Single(RecipeReader.Parse($"[[step]]\nfilter = \"{id}\"\n{spec.Name} = {text}", "r.toml").Steps);
            Assert.Equal(spec.Default.ToString(), step.Parameters[spec.Name].ToString());
            Assert.Equal(spec.Default.Form, step.Parameters[spec.Name].Form);
        }
    }

    [Fact]
    public void A_format_tells_the_endings_of_its_names()
    {
        foreach (IStackFormat format in Catalogue.Formats.Select(f => f.Format))
        {
            Assert.Matches(HyphenatedWords(), format.Id);
            Assert.Contains(format.Extension, format.Endings);
            Assert.All(format.Endings, e => Assert.Matches(Ending(), e));
        }
    }

    private static void Sentence(string text)
    {
        Assert.True(text.Trim().Length >= 3, $"'{text}' says nothing");
        Assert.DoesNotContain('\n', text);
        Assert.Equal(text.Trim(), text);
    }

    [GeneratedRegex("^[a-z0-9]+(-[a-z0-9]+)*$")]
    private static partial Regex HyphenatedWords();

    [GeneratedRegex("^[a-z0-9]+(_[a-z0-9]+)*$")]
    private static partial Regex SnakeWords();

    [GeneratedRegex("^\\.[a-z0-9.]+$")]
    private static partial Regex Ending();
}
