using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>Finds the filters of a recipe's steps and checks their parameters; needs no stack.</summary>
public static class StepBinder
{
    /// <summary>The steps with checked parameters, in order.</summary>
    /// <exception cref="RecipeException">
    /// Unknown filter or parameter, value not allowed, parameter left out, or a filter that needs a noise model in a
    /// recipe without one; the message starts with file, line and column.
    /// </exception>
    public static IReadOnlyList<PlannedStep> Bind(Recipe recipe, PluginCatalogue catalogue) =>
        [.. recipe.Steps.Select(s => Bind(s, recipe, catalogue))];

    private static PlannedStep Bind(StepSection section, Recipe recipe, PluginCatalogue catalogue)
    {
        CatalogueFilter filter = catalogue.Filter(section.Filter) ?? throw new RecipeException(
            section.FilterPlace.ToString(), $"unknown filter {section.Filter}", NearestWord.Remedy(section.Filter, [.. catalogue.Filters.Select(f => f.Plugin.Id)]));
        IReadOnlyList<ParameterSpec> specs = filter.Plugin.Parameters;
        foreach (string key in section.Parameters.Keys)
        {
            if (!specs.Any(s => s.Name == key))
            {
                throw new RecipeException(section.Places[key].ToString(), $"unknown key {key} in a step with filter {section.Filter}",
                    NearestWord.Remedy(key, ["filter", "channel", .. specs.Select(s => s.Name)]));
            }
        }

        if (filter.Plugin.NeedsNoise && recipe.Noise.Count == 0)
        {
            throw new RecipeException(section.FilterPlace.ToString(), $"filter {section.Filter} needs a noise model and the recipe has none",
                "add [noise] with from = \"values\" and gain, read_noise and pedestal, or from = \"header\", or from = \"frame\"");
        }

        try
        {
            return new PlannedStep(filter, new ParameterValues(specs, section.Parameters), section);
        }
        catch (ParameterException e)
        {
            throw AtPlace(e, section);
        }
    }

    /// <summary>The same error with the place of its key in the recipe.</summary>
    internal static RecipeException AtPlace(ParameterException e, StepSection section)
    {
        RecipePlace place = section.Places.TryGetValue(e.Parameter, out RecipePlace key) ? key : section.Place;
        return new RecipeException(place.ToString(), $"{e.Parameter} of filter {section.Filter}: {e.What}", e.Remedy, e);
    }
}
